"""Inputs that nobody publishes, found from those that are: fan pressure ratio and turbine-entry temperature.

Fan pressure ratio: the one at which the bypass jet has the share ``fan efficiency x LP turbine efficiency`` of the core
jet's velocity, where specific consumption at given bypass ratio and temperature is least (Guha, *J. of Propulsion and
Power* 17, 2001, from memory); for a mixed exhaust the one at which both total pressures meet in the mixer.
Turbine-entry temperature: the one at which the rated thrust burns the rated fuel.
"""

from __future__ import annotations

from dataclasses import fields, replace

import numpy as np

from sim.cycle_design import SFC_RANGE, design, faults, walk_for_one_kg
from sim.cycle_inputs import MIXED, GasPath, Number, repeated, stacked
from sim.cycle_path import Walk
from sim.errors import NoSolutionError, OutOfRangeError
from sim.gas import Values
from sim.newton import newton

FAN_RANGE = (1.2, 2.2)
"""Pressure ratios that a fan of one or two stages gives; the optimum is taken within."""

ENTRY_RANGE_K = (1350.0, 1900.0)

FUEL_ROUNDING = 0.002
"""A rated fuel flow this share below the least that the model reaches is taken as the least: figures are rounded."""

_TOLERANCE = 1e-9


def with_best_fan(path: GasPath[Values]) -> GasPath[Values]:
    """Return the stack with each engine's best fan pressure ratio within 1.2 to 2.2, overall pressure ratio kept.

    An engine for which none is found keeps a customary one; ``faults`` of its design tells if that cannot be.
    """
    many, start = repeated(path, 2), _start_fan(path)

    def misfit(logs: Values) -> Values:
        trial = _with_fan(many, np.exp(logs[0]))
        return _fan_misfit(trial, walk_for_one_kg(trial))[None]

    with np.errstate(invalid="ignore", divide="ignore"):
        found = _with_fan(path, np.exp(newton(misfit, np.log(start)[None], tolerance=_TOLERANCE)[0]))
        solved = np.abs(_fan_misfit(found, walk_for_one_kg(found))) < 10.0 * _TOLERANCE
    return _with_fan(path, np.clip(np.where(solved, found.fan_pressure_ratio, start), *FAN_RANGE))


def with_fuel(path: GasPath[float], *, takeoff_fuel_kg_per_s: float, best_fan: bool) -> GasPath[float]:
    """Return the path with the effective turbine-entry temperature at which the rated thrust burns that fuel.

    With ``best_fan`` the fan pressure ratio follows the temperature as in ``with_best_fan``, else it stays as given.
    Raises OutOfRangeError where the specific consumption is outside 6 to 14 g/(kN s), NoSolutionError where no
    temperature of 1350 to 1900 K fits.
    """
    sfc = takeoff_fuel_kg_per_s / path.thrust_N * 1e6
    if not SFC_RANGE[0] <= sfc <= SFC_RANGE[1]:
        raise OutOfRangeError("take-off specific fuel consumption", f"{sfc:.2f} g/(kN s)", "6 to 14 g/(kN s)")
    if best_fan:
        path, solved = _fan_and_entry(path, sfc)
        if solved:
            return path
    return replace(path, turbine_entry_K=_entry(path, sfc))


def customary_fan(bypass_ratio: Number) -> Number:
    """Return the pressure ratio that engines of that bypass ratio have about (own fit to 1.70 at 5.1, 1.42 at 11)."""
    ratio: Number = 1.0 + 0.7 * (5.1 / bypass_ratio) ** 0.66
    return ratio


def _start_fan(path: GasPath[Values]) -> Values:
    """Return the ratio nearest to the best one among a few down from the customary: high ones may not run at all."""
    tries = 1.0 + (customary_fan(path.bypass_ratio) - 1.0) * np.array([1.4, 1.2, 1.0, 0.8, 0.6, 0.4])[:, None]
    many = _with_fan(repeated(path, tries.shape[0]), tries.ravel())
    with np.errstate(invalid="ignore", divide="ignore"):
        far = np.abs(_fan_misfit(many, walk_for_one_kg(many))).reshape(tries.shape)
    best = np.argmin(np.where(np.isfinite(far), far, np.inf), axis=0)
    ratio: Values = tries[best, np.arange(tries.shape[1])]
    return ratio


def _with_fan(path: GasPath[Values], ratio: Values) -> GasPath[Values]:
    """Return the path with another fan pressure ratio and the overall pressure ratio that it had."""
    hpc = path.hpc_pressure_ratio * path.fan_pressure_ratio / ratio
    return replace(path, fan_pressure_ratio=ratio, hpc_pressure_ratio=hpc)


def _fan_misfit(path: GasPath[Values], done: Walk) -> Values:
    """Return how far the fan's pressure is from its best, relative."""
    exhaust = done.exhaust
    if path.exhaust == MIXED:
        return np.log(exhaust.bypass.pressure / exhaust.core.pressure)
    return exhaust.bypass_jet.velocity / exhaust.core_jet.velocity - path.fan_efficiency * path.lpt_efficiency


def _fan_and_entry(path: GasPath[float], sfc: float) -> tuple[GasPath[float], bool]:
    """Return the path with best fan and fitting temperature, and true; or with a fan from the range, and false."""
    many = repeated(stacked([path]), 3)
    start = np.log([_start_fan(stacked([path]))[0], path.turbine_entry_K])[:, None]

    def tried(logs: Values, stack: GasPath[Values]) -> GasPath[Values]:
        return replace(_with_fan(stack, np.exp(logs[0])), turbine_entry_K=np.exp(logs[1]))

    def misfit(logs: Values, stack: GasPath[Values] = many) -> Values:
        trial = tried(logs, stack)
        done = walk_for_one_kg(trial)
        return np.stack([_fan_misfit(trial, done), np.log(done.fuel_flow / done.net_thrust * 1e6 / sfc)])

    with np.errstate(invalid="ignore", divide="ignore"):
        logs = newton(misfit, start, tolerance=_TOLERANCE)
        exact = float(np.max(np.abs(misfit(logs, stacked([path]))))) < 10.0 * _TOLERANCE
    ratio, entry_K = float(np.exp(logs[0, 0])), float(np.exp(logs[1, 0]))
    inside = FAN_RANGE[0] <= ratio <= FAN_RANGE[1] and ENTRY_RANGE_K[0] <= entry_K <= ENTRY_RANGE_K[1]
    result = tried(logs if exact else start, stacked([path]))
    if exact and inside:
        return first(result), True
    return first(_with_fan(result, np.clip(result.fan_pressure_ratio, *FAN_RANGE))), False


def first(path: GasPath[Values]) -> GasPath[float]:
    """Return the first engine of a stack as plain numbers."""
    numbers = {
        field.name: float(getattr(path, field.name)[0])
        for field in fields(GasPath)
        if field.name not in ("spools", "exhaust")
    }
    return GasPath(spools=path.spools, exhaust=path.exhaust, **numbers)


def _entry(path: GasPath[float], sfc: float) -> float:
    """Return the temperature of a specific consumption at fixed pressure ratios, K.

    More temperature burns more fuel for the thrust, except near the least that drives the fan at all. A grid laid anew
    inside the bracket finds the root on the rising branch, which Newton's rule could miss.
    """

    def consumption(temperatures: Values) -> Values:
        engine = design(replace(repeated(stacked([path]), temperatures.size), turbine_entry_K=temperatures))
        good = np.array([not why for why in faults(engine)])
        return np.where(good, engine.walk.fuel_flow / path.thrust_N * 1e6, np.nan)

    grid = np.linspace(*ENTRY_RANGE_K, 56)
    coarse = consumption(grid)
    if not np.isfinite(coarse).any():
        raise NoSolutionError("turbine-entry temperature", "no engine of these pressure ratios and efficiencies runs")
    rising = [i for i in range(len(grid) - 1) if coarse[i] <= sfc < coarse[i + 1]]
    if rising:
        # Consumption rises in between, and is as good as straight within the finer grid's steps of under a kelvin.
        finer = np.linspace(grid[rising[-1]], grid[rising[-1] + 1], 12)
        return float(np.interp(sfc, consumption(finer), finer))
    least = int(np.nanargmin(coarse))
    if coarse[least] * (1.0 - FUEL_ROUNDING) <= sfc <= coarse[least]:
        return float(grid[least])
    raise NoSolutionError(
        "turbine-entry temperature",
        f"none of 1350 to 1900 K burns {sfc:.3f} g/(kN s) at take-off; with these efficiencies the model reaches "
        f"{np.nanmin(coarse):.3f} to {np.nanmax(coarse):.3f}",
    )
