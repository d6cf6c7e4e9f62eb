"""One turbofan at work: stations at a condition, refused with a reason where the model may not answer.

The equations stand in the files beside this one: sim/gas.py (properties), sim/cycle_components.py (one component each),
sim/cycle_path.py (the walk), sim/cycle_design.py and sim/cycle_offdesign.py (what fixes the point of work).
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import NamedTuple

import numpy as np

from sim.atmosphere import SEA_LEVEL_K, SEA_LEVEL_PA, standard_air
from sim.cycle_components import Stream
from sim.cycle_design import designed
from sim.cycle_inputs import EFFICIENCY, MIXED, THREE_SPOOLS, Change, Flight, GasPath, Lost, changes_of
from sim.cycle_offdesign import Operating, solve
from sim.cycle_path import Walk
from sim.errors import NoSolutionError, OutOfRangeError

THRUST_RANGE = (0.6, 1.1)
"""Share of rated take-off thrust that the model answers for; idle and approach are out of reach of its rules."""

LOST_RANGE = (-0.02, 0.08)
"""Loss of a component that the model answers for."""


class Station(NamedTuple):
    """One station of the gas path (numbers of SAE ARP 755) of one engine; totals."""

    station: str
    place: str
    flow_kg_per_s: float
    temperature_K: float
    pressure_kPa: float
    fuel_air_ratio: float


def check_lost(lost: Mapping[Change, float], *, spools: int) -> None:
    """Raise OutOfRangeError for a loss outside -2 to 8 %, or of a component that the engine does not have."""
    known = changes_of(spools)
    for change, share in lost.items():
        if change not in known:
            raise OutOfRangeError("lost component", f"{change.component} {change.kind}", f"one of {spools} spools")
        if not LOST_RANGE[0] <= share <= LOST_RANGE[1]:
            what = "efficiency lost" if change.kind == EFFICIENCY else f"change of {change.kind.replace('_', ' ')}"
            raise OutOfRangeError(f"{change.component} {what}", f"{share:.4f}", "-0.02 to 0.08")


def takeoff(
    path: GasPath[float],
    *,
    thrust_frac: float = 1.0,
    ambient_K: float = SEA_LEVEL_K,
    lost: Mapping[Change, float] | None = None,
) -> Operating:
    """Return the engine static at sea level at a share of its rated thrust.

    Raises OutOfRangeError outside 0.6 to 1.1 of rated thrust (idle cannot be answered) or -2 to 8 % lost, and
    NoSolutionError where the equations have no acceptable root.
    """
    if not THRUST_RANGE[0] <= thrust_frac <= THRUST_RANGE[1]:
        raise OutOfRangeError(
            "share of rated thrust",
            f"{thrust_frac:.3f}",
            "0.6 to 1.1",
            "idle and approach are out of this model's reach",
        )
    flight = Flight(np.array([ambient_K]), np.array([SEA_LEVEL_PA]), np.zeros(1))
    return _at(path, flight, thrust_N=thrust_frac * path.thrust_N, lost=lost or {}, name="take-off")


def cruise(
    path: GasPath[float],
    *,
    height_m: float,
    mach: float,
    thrust_N: float,
    lost: Mapping[Change, float] | None = None,
) -> Operating:
    """Return the engine in flight on a standard day at a net thrust.

    Raises OutOfRangeError for a height outside -500 to 20,000 m or a Mach number outside 0 to 0.95, NoSolutionError
    where the equations have no acceptable root.
    """
    if not 0.0 <= mach <= 0.95:
        raise OutOfRangeError("Mach number", f"{mach:g}", "0 to 0.95")
    air = standard_air(height_m)
    flight = Flight(np.array([air.temperature_K]), np.array([air.pressure_Pa]), np.array([mach]))
    return _at(path, flight, thrust_N=thrust_N, lost=lost or {}, name="cruise")


def _at(path: GasPath[float], flight: Flight, *, thrust_N: float, lost: Mapping[Change, float], name: str) -> Operating:
    check_lost(lost, spools=path.spools)
    arrays: Lost = {change: np.array([share]) for change, share in lost.items()}
    state = solve(designed(path), flight=flight, thrust_N=np.array([thrust_N]), lost=arrays)
    if not state.solved[0]:
        raise NoSolutionError(
            name, f"no acceptable root at {thrust_N / 1000:g} kN (the residual is {state.residual[0]:.1e})"
        )
    return state


def stations(path: GasPath[float], done: Walk, *, engine: int = 0) -> list[Station]:
    """Return the stations of one engine of a stack from intake to nozzles."""
    cold, hot, exhaust = done
    core = cold.middle.outlet.flow
    listed: list[tuple[str, str, Stream]] = [
        ("2", "fan inlet", cold.intake),
        ("13", "bypass behind the fan", cold.fan.outlet._replace(flow=cold.intake.flow - core)),
        ("21", "core behind the fan", cold.fan.outlet._replace(flow=core)),
        ("25", "HPC inlet", cold.middle.outlet),
        ("3", "HPC exit", cold.hpc.outlet),
        ("4", "combustor exit", hot.combustor_exit),
        ("41", "HPT rotor inlet", hot.hpt_inlet),
    ]
    if path.spools == THREE_SPOOLS:
        listed.append(("43", "IPT inlet", hot.ipt_inlet))
    listed += [("45", "LPT inlet", hot.lpt_inlet), ("5", "LPT exit", hot.lpt_exit), ("8", "core nozzle", exhaust.core)]
    listed.append(
        ("16", "mixer, bypass side", exhaust.bypass)
        if path.exhaust == MIXED
        else ("18", "bypass nozzle", exhaust.bypass)
    )
    return [
        Station(
            number,
            place,
            float(stream.flow[engine]),
            float(stream.temperature[engine]),
            float(stream.pressure[engine]) / 1000.0,
            float(stream.fuel_air_ratio[engine]),
        )
        for number, place, stream in listed
    ]
