"""The turbofan away from its design point, at a given net thrust: what remains fixed is metal.

Unknown are three pressure ratios, turbine-entry temperature, bypass ratio and airflow. Six conditions fix them: the
choked throats of HP and LP turbine, the two nozzles (of a mixed engine: its nozzle, and one static pressure in the
mixer), the thrust, and for the compressor in the middle either the IP turbine's throat or, for a booster, the speed
that the fan gives to the shaft they share. Newton's rule works on the logarithms; the residual is checked.

The HP compressor's own characteristic only tells its speed: no first-order effect of its flow capacity is left.
"""

from __future__ import annotations

from dataclasses import fields
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sim.atmosphere import SEA_LEVEL_K, SEA_LEVEL_PA
from sim.cycle_components import choked_throat, shaft_speed, work_at_speed
from sim.cycle_design import LEAST_CHOKING_RATIO, Engine, Sizes, mixer_head, volume
from sim.cycle_inputs import (
    FLOW_CAPACITY,
    MIXED,
    THREE_SPOOLS,
    THROAT_AREA,
    Change,
    Flight,
    Lost,
    middle_of,
    repeated,
)
from sim.cycle_path import Point, Walk, walk
from sim.gas import Values
from sim.newton import newton

UNKNOWNS = len(Point._fields)
TOLERANCE = 1e-11
"""Largest relative residual of a solution; rounding in the inversions leaves some 1e-13."""

FLOW_RANGE = (0.5, 1.25)
"""Volume flow of the fan over its design flow within which its straight characteristic may stand; own judgement."""

HOTTEST_ENTRY_K = 2300.0
"""Above it the gas would not be frozen, and no turbine would stand it."""

LEAST_BOOSTER = 1.0 + 1e-9
"""A pressure ratio of one means that there is no booster."""


class Operating(NamedTuple):
    """A stack at work. ``solved`` is false where no acceptable root was found, and the rest is then not to be used."""

    point: Point
    walk: Walk
    residual: Values
    solved: NDArray[np.bool_]


def tiled(engine: Engine, times: int) -> Engine:
    """Return the stack laid ``times`` times one behind the other (its design walk is left out)."""
    sizes = Sizes(**{field.name: np.tile(getattr(engine.sizes, field.name), times) for field in fields(Sizes)})
    point = Point(*(np.tile(value, times) for value in engine.point))
    return Engine(path=repeated(engine.path, times), point=point, walk=engine.walk, sizes=sizes)


def at(engine: Engine, steps: Values) -> Point:
    """Return the point whose logarithms lie ``steps`` (shape (6, n)) away from the design point."""
    return Point(*(value * np.exp(step) for value, step in zip(engine.point, steps, strict=True)))


def misfit(engine: Engine, done: Walk, *, flight: Flight, thrust_N: Values, lost: Lost) -> Values:
    """Return the six relative residuals, shape (6, n), of a walk through engines of known sizes."""
    path, sizes = engine.path, engine.sizes
    hot, exhaust = done.turbines, done.exhaust
    nothing = np.zeros(1)

    def opened(component: str) -> Values:
        return 1.0 + lost.get(Change(component, THROAT_AREA), nothing)

    if path.spools == THREE_SPOOLS:
        middle = np.log(choked_throat(hot.ipt_inlet) / (sizes.ipt_throat * opened("ipt")))
    else:
        middle = _booster_misfit(engine, done, lost=lost)
    if path.exhaust == MIXED:
        core_static = exhaust.core.pressure - mixer_head(exhaust.core) / sizes.mixer_core**2
        bypass_static = exhaust.bypass.pressure - mixer_head(exhaust.bypass) / sizes.mixer_bypass**2
        bypass = core_static / bypass_static - 1.0
    else:
        bypass = np.log(exhaust.bypass_jet.area / sizes.bypass_nozzle)
    return np.stack(
        [
            np.log(choked_throat(hot.hpt_inlet) / (sizes.hpt_throat * opened("hpt"))),
            np.log(choked_throat(hot.lpt_inlet) / (sizes.lpt_throat * opened("lpt"))),
            middle,
            np.log(exhaust.core_jet.area / sizes.core_nozzle),
            bypass,
            done.net_thrust / thrust_N - 1.0,
        ]
    )


def _booster_misfit(engine: Engine, done: Walk, *, lost: Lost) -> Values:
    """Return how far the booster's work is from what its shaft's speed allows; without a booster it has no pressure."""
    sizes, cold, slope = engine.sizes, done.compressors, engine.path.loading_slope

    def capacity(component: str) -> Values:
        return 1.0 - lost.get(Change(component, FLOW_CAPACITY), np.zeros(1))

    speed = shaft_speed(
        flow=volume(cold.intake) / (sizes.fan_volume * capacity("fan")),
        work=cold.fan.ideal_work / sizes.fan_work,
        slope=slope,
    )
    flow = volume(cold.fan.outlet._replace(flow=cold.middle.outlet.flow)) / sizes.middle_volume
    allowed = work_at_speed(flow=flow / capacity(middle_of(engine.path.spools)), speed=speed, slope=slope)
    ratio = cold.middle.outlet.pressure / cold.fan.outlet.pressure
    fitted = engine.point.middle_pressure_ratio > LEAST_BOOSTER
    design_work = np.where(fitted, sizes.middle_work, 1.0)
    return np.where(fitted, cold.middle.ideal_work / design_work - allowed, np.log(ratio))


def solve(engine: Engine, *, flight: Flight, thrust_N: Values, lost: Lost) -> Operating:
    """Return the stack at a net thrust in flight, with what its modules have lost.

    Nothing raises here: an engine without an acceptable root is marked. ``sim/cycle.py`` refuses it by name.
    """
    copies = UNKNOWNS + 1
    many = tiled(engine, copies)
    many_flight = Flight(*(np.tile(value, copies) for value in flight))
    many_lost = {change: np.tile(np.broadcast_to(v, thrust_N.shape), copies) for change, v in lost.items()}
    many_thrust = np.tile(thrust_N, copies)

    def misfits(steps: Values) -> Values:
        done = walk(many.path, at(many, steps), flight=many_flight, lost=many_lost)
        return misfit(many, done, flight=many_flight, thrust_N=many_thrust, lost=many_lost)

    with np.errstate(invalid="ignore", divide="ignore", over="ignore"):
        steps = newton(misfits, _start(engine, flight), tolerance=TOLERANCE / 10.0)
        point = at(engine, steps)
        done = walk(engine.path, point, flight=flight, lost=lost)
        left = misfit(engine, done, flight=flight, thrust_N=thrust_N, lost=lost)
        worst = np.max(np.abs(left), axis=0)
        good = (worst < TOLERANCE) & (done.turbines.lpt.pressure_ratio > LEAST_CHOKING_RATIO)
        good &= (point.fan_pressure_ratio > 1.0) & (point.hpc_pressure_ratio > 1.0)
        good &= (done.exhaust.core.pressure > flight.pressure_Pa) & (point.turbine_entry_K < HOTTEST_ENTRY_K)
        flow = volume(done.compressors.intake) / engine.sizes.fan_volume
        good &= (flow > FLOW_RANGE[0]) & (flow < FLOW_RANGE[1])
    return Operating(point, done, worst, good)


def _start(engine: Engine, flight: Flight) -> Values:
    """Return the first guess: the design point's corrected flow and temperature ratio in the new air."""
    ratio = flight.temperature_K * (1.0 + 0.2 * flight.mach**2) / SEA_LEVEL_K
    pressure = flight.pressure_Pa * (1.0 + 0.2 * flight.mach**2) ** 3.5 / SEA_LEVEL_PA
    steps = np.zeros((UNKNOWNS, engine.count))
    steps[Point._fields.index("turbine_entry_K")] = np.log(ratio)
    steps[Point._fields.index("airflow")] = np.log(pressure / np.sqrt(ratio))
    return steps
