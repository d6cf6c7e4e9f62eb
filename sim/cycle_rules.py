"""What a gas path is taken to be where nobody has said: customary figures, each named when it is used.

The user knows thrust, bypass and overall pressure ratio, and perhaps the rated fuel flow; the rest of a cycle is rarely
published. Every input that a rule filled is listed, and its uncertainty goes into the bands of the coefficients.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import NamedTuple

from sim.cycle_inputs import OVERALL_RANGE, SEPARATE, THREE_SPOOLS, TWO_SPOOLS, GasPath, check_path, middle_of, stacked
from sim.cycle_match import customary_fan, first, with_best_fan, with_fuel
from sim.errors import OutOfRangeError

CUSTOMARY: dict[str, float] = {
    "fan_efficiency": 0.91,
    "middle_efficiency": 0.89,
    "hpc_efficiency": 0.865,
    "combustor_efficiency": 1.0,
    "hpt_efficiency": 0.91,
    "ipt_efficiency": 0.91,
    "lpt_efficiency": 0.925,
    "combustor_loss": 0.05,
    "core_duct_loss": 0.01,
    "bypass_duct_loss": 0.015,
    "ngv_cooling": 0.08,
    "hpt_cooling": 0.05,
    "ipt_cooling": 0.0,
    "lpt_cooling": 0.02,
    "nozzle_velocity_coefficient": 0.99,
    "shaft_efficiency": 0.995,
    "fuel_heat_J_per_kg": 43.1e6,
    "loading_slope": 3.0,
}
"""Common practice, from memory; the middle of the three reference cycles of this project's checks. The slope of the
characteristic lies between the ideal stage at low speed (about 1) and the almost upright lines that transonic fans and
boosters have at design speed (above 8)."""

BOOSTER_PRESSURE_RATIO = 1.5


class Filled(NamedTuple):
    """A complete gas path, the names of the inputs that were given, and a sentence for each that a rule filled."""

    path: GasPath[float]
    given: frozenset[str]
    assumed: tuple[str, ...]


def customary_entry(overall_pressure_ratio: float) -> float:
    """Return the effective turbine-entry temperature that engines of that pressure ratio have about, K.

    Own line through 385 engines whose temperature was found from the take-off fuel flow in the ICAO emissions databank
    (standard deviation 78 K; sim/METHOD.md).
    """
    return 1632.0 + 4.6 * (overall_pressure_ratio - 30.0)


def gas_path(
    known: Mapping[str, float],
    *,
    overall_pressure_ratio: float,
    spools: int = TWO_SPOOLS,
    exhaust: str = SEPARATE,
    takeoff_fuel_kg_per_s: float | None = None,
) -> Filled:
    """Return a gas path from what is known: fields of ``GasPath`` by name, at least thrust_N and bypass_ratio.

    The fan pressure ratio follows from the jets, the turbine-entry temperature from the fuel flow or, without it, from
    the overall pressure ratio; the HP compressor takes what pressure is left. A known temperature goes before the fuel.
    Raises OutOfRangeError and NoSolutionError as the design point does.
    """
    if not OVERALL_RANGE[0] <= overall_pressure_ratio <= OVERALL_RANGE[1]:
        raise OutOfRangeError("overall pressure ratio", f"{overall_pressure_ratio:g}", "10 to 60")
    values = {**CUSTOMARY, **known}
    assumed = [_words(name, spools) for name in CUSTOMARY if _is_assumed(name, known, spools=spools)]
    best_fan = "fan_pressure_ratio" not in known
    fuel_known = takeoff_fuel_kg_per_s is not None and "turbine_entry_K" not in known
    fan = values.setdefault("fan_pressure_ratio", customary_fan(values["bypass_ratio"]))
    middle = BOOSTER_PRESSURE_RATIO if spools == TWO_SPOOLS else max(1.2, (overall_pressure_ratio / fan) ** 0.5)
    middle = values.setdefault("middle_pressure_ratio", middle)
    values.setdefault("turbine_entry_K", customary_entry(overall_pressure_ratio))
    values["hpc_pressure_ratio"] = overall_pressure_ratio / (fan * middle)
    path: GasPath[float] = GasPath(spools=spools, exhaust=exhaust, **values)
    check_path(path)
    if fuel_known and takeoff_fuel_kg_per_s is not None:
        path = with_fuel(path, takeoff_fuel_kg_per_s=takeoff_fuel_kg_per_s, best_fan=best_fan)
        assumed.append(f"turbine entry {path.turbine_entry_K:.0f} K, from the take-off fuel flow")
    else:
        if best_fan:
            path = first(with_best_fan(stacked([path])))
        if "turbine_entry_K" not in known:
            assumed.append(f"turbine entry {path.turbine_entry_K:.0f} K, from the overall pressure ratio")
    if best_fan:
        assumed.append(f"fan pressure ratio {path.fan_pressure_ratio:.3f}, best for the jets")
    if "middle_pressure_ratio" not in known:
        name = "booster" if spools == TWO_SPOOLS else "IP compressor"
        assumed.append(f"{name} pressure ratio {middle:.3g}")
    check_path(path)
    given = frozenset(known) | ({"turbine_entry_K"} if fuel_known else set())
    return Filled(path, given, tuple(assumed))


def _is_assumed(name: str, known: Mapping[str, float], *, spools: int) -> bool:
    """Return whether a customary figure is used for a component that the engine has."""
    return name not in known and (spools == THREE_SPOOLS or not name.startswith("ipt_"))


def _words(name: str, spools: int) -> str:
    if name == "fuel_heat_J_per_kg":
        return f"lower heating value {CUSTOMARY[name] / 1e6:g} MJ/kg"
    return f"{name.replace('middle', middle_of(spools)).replace('_', ' ')} {CUSTOMARY[name]:g}"
