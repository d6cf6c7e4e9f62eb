"""The design point of a turbofan: airflow for the rated thrust, and the areas and references that stay with the engine.

Design is the rated take-off thrust, static, standard day at sea level. What comes out is an ``Engine``: inputs, the
point, and every fixed size that an off-design point must fit.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from sim.atmosphere import SEA_LEVEL_K, SEA_LEVEL_PA
from sim.cycle_components import Stream, choked_throat
from sim.cycle_inputs import MIXED, Flight, GasPath, check_path, stacked
from sim.cycle_path import Point, Walk, walk
from sim.errors import NoSolutionError
from sim.gas import Values

SFC_RANGE = (6.0, 14.0)
"""Take-off specific fuel consumption, g/(kN s), of a turbofan that can be."""

LEAST_CHOKING_RATIO = 2.0
"""Below this pressure ratio of the LP turbine its first nozzle may not be choked, and the off-design rule fails."""

LEAST_CORE_PRESSURE_RATIO = 1.03
"""Core nozzle total pressure over ambient at which the core still makes a jet."""

MIXER_HEAD = 0.10
"""Dynamic head over total pressure of the core stream at the mixer (Mach 0.38; a customary value, from memory)."""

MIXER_HEAD_RANGE = (0.02, 0.30)


@dataclass(frozen=True, slots=True, kw_only=True)
class Sizes:
    """What metal fixes, each of shape (n,): effective areas in m2, and flow and work that compressors compare with."""

    hpt_throat: Values
    ipt_throat: Values
    lpt_throat: Values
    core_nozzle: Values
    bypass_nozzle: Values
    mixer_core: Values
    mixer_bypass: Values
    fan_volume: Values
    fan_work: Values
    middle_volume: Values
    middle_work: Values


@dataclass(frozen=True, slots=True, kw_only=True)
class Engine:
    """A stack of engines whose sizes are known."""

    path: GasPath[Values]
    point: Point
    walk: Walk
    sizes: Sizes

    @property
    def count(self) -> int:
        return int(self.point.airflow.shape[0])


def volume(stream: Stream) -> Values:
    """Return W T / p, to which the volume flow is proportional."""
    return stream.flow * stream.temperature / stream.pressure


def mixer_head(stream: Stream) -> Values:
    """Return the dynamic head in Pa times area squared: W^2 R T / (2 p), first order in Mach number squared."""
    return stream.flow**2 * stream.gas.gas_constant * stream.temperature / (2.0 * stream.pressure)


def sea_level(count: int, *, warmer_K: float = 0.0) -> Flight:
    """Return static sea level for a stack, ``warmer_K`` above the standard day."""
    one = np.ones(count)
    return Flight((SEA_LEVEL_K + warmer_K) * one, SEA_LEVEL_PA * one, 0.0 * one)


def design(path: GasPath[Values]) -> Engine:
    """Return a stack of engines at their design points; one that cannot be built holds not-a-number.

    ``faults`` tells which and why; nothing here raises, so that one bad engine does not stop the others.
    """
    with np.errstate(invalid="ignore", divide="ignore"):
        for_one_kg = walk_for_one_kg(path).net_thrust
        point = _point(path, np.where(for_one_kg > 0.0, path.thrust_N / for_one_kg, np.nan))
        done = walk(path, point, flight=sea_level(for_one_kg.shape[0]), lost={})
        return Engine(path=path, point=point, walk=done, sizes=_sizes(path, done))


def walk_for_one_kg(path: GasPath[Values]) -> Walk:
    """Return the gas path of a stack at its design points for an airflow of one kilogram a second."""
    one = np.ones_like(path.thrust_N)
    return walk(path, _point(path, one), flight=sea_level(one.shape[0]), lost={})


def _point(path: GasPath[Values], airflow: Values) -> Point:
    return Point(
        path.fan_pressure_ratio,
        path.middle_pressure_ratio,
        path.hpc_pressure_ratio,
        path.turbine_entry_K,
        path.bypass_ratio,
        airflow,
    )


def _sizes(path: GasPath[Values], done: Walk) -> Sizes:
    cold, hot, exhaust = done
    mixer_core = mixer_bypass = np.ones_like(path.thrust_N)
    if path.exhaust == MIXED:
        static = exhaust.core.pressure * (1.0 - MIXER_HEAD)
        mixer_core = np.sqrt(mixer_head(exhaust.core) / (MIXER_HEAD * exhaust.core.pressure))
        mixer_bypass = np.sqrt(mixer_head(exhaust.bypass) / (exhaust.bypass.pressure - static))
    return Sizes(
        hpt_throat=choked_throat(hot.hpt_inlet),
        ipt_throat=choked_throat(hot.ipt_inlet),
        lpt_throat=choked_throat(hot.lpt_inlet),
        core_nozzle=exhaust.core_jet.area,
        bypass_nozzle=exhaust.bypass_jet.area,
        mixer_core=mixer_core,
        mixer_bypass=mixer_bypass,
        fan_volume=volume(cold.intake),
        fan_work=cold.fan.ideal_work,
        middle_volume=volume(cold.fan.outlet._replace(flow=cold.middle.outlet.flow)),
        middle_work=cold.middle.ideal_work,
    )


def faults(engine: Engine) -> list[str]:
    """Return for each engine of the stack why its design is not acceptable; empty text where it is."""
    found = [""] * engine.count
    path, done = engine.path, engine.walk
    with np.errstate(invalid="ignore"):
        sfc = done.fuel_flow / path.thrust_N * 1e6
        core_ratio = done.exhaust.core.pressure / SEA_LEVEL_PA
        unsolved = ~(np.isfinite(sfc) & np.isfinite(core_ratio))
        bypass = done.exhaust.bypass.pressure
        head = 1.0 - done.exhaust.core.pressure * (1.0 - MIXER_HEAD) / bypass
        tests = [
            (unsolved, "the turbines cannot give what the compressors take; raise the turbine-entry temperature or "
             "lower the fan pressure ratio"),
            (core_ratio < LEAST_CORE_PRESSURE_RATIO, "the core has no pressure left for a jet; raise the "
             "turbine-entry temperature or lower the fan pressure ratio"),
            (done.turbines.lpt.pressure_ratio < LEAST_CHOKING_RATIO, "the LP turbine's nozzle would not be choked, "
             "which the off-design rule assumes"),
            ((sfc < SFC_RANGE[0]) | (sfc > SFC_RANGE[1]), "take-off specific fuel consumption outside 6 to 14 "
             "g/(kN s)"),
        ]  # fmt: skip
        if path.exhaust == MIXED:
            tests.append((
                (head < MIXER_HEAD_RANGE[0]) | (head > MIXER_HEAD_RANGE[1]),
                "bypass and core pressures do not meet in the mixer; leave the fan pressure ratio blank",
            ))  # fmt: skip
    for where, why in reversed(tests):
        found = [why if bad else before for bad, before in zip(where, found, strict=True)]
    return found


def designed(path: GasPath[float]) -> Engine:
    """Return one engine, checked.

    Raises OutOfRangeError for an input outside its range, NoSolutionError where the design is not acceptable.
    """
    check_path(path)
    engine = design(stacked([path]))
    why = faults(engine)[0]
    if why:
        raise NoSolutionError("design point", why)
    return engine
