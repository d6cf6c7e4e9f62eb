"""What a worn, restored or exchanged module does to EGT and fuel, from the influence matrix.

The sum of coefficients is straight enough below some 60 K; above it the cycle is solved. Neither tells from EGT and
fuel which module is worn: HPC and HPT look alike in both, so a module's condition is an input and never inferred here.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import NamedTuple

from sim.cycle import check_lost, cruise, takeoff
from sim.cycle_inputs import EFFICIENCY, FLOW_CAPACITY, PRESSURE_LOSS, THROAT_AREA, Change
from sim.errors import RequestError
from sim.influence import LPT_INLET, POINT, Matrix

LINEAR_LIMIT_K = 60.0
"""Above this sum of degrees the cycle is solved instead."""

_FLOW_KIND = {
    "fan": FLOW_CAPACITY,
    "booster": FLOW_CAPACITY,
    "ipc": FLOW_CAPACITY,
    "hpc": FLOW_CAPACITY,
    "combustor": PRESSURE_LOSS,
    "hpt": THROAT_AREA,
    "ipt": THROAT_AREA,
    "lpt": THROAT_AREA,
}
"""What "flow" means for a component: capacity lost, pressure loss more, throat opened."""


class Effect(NamedTuple):
    """Change of EGT at the corner point and of fuel; ``solved`` is true where the cycle was solved, not summed."""

    egt_K: float
    fuel_takeoff_frac: float
    fuel_cruise_frac: float
    solved: bool


class PerPoint(NamedTuple):
    """What one point of efficiency lost in a module takes: degC of margin, and share of cruise fuel for each degC."""

    degC: float
    fuel_frac: float

    @property
    def fuel_frac_per_degC(self) -> float:
        return self.fuel_frac / self.degC


def effect(matrix: Matrix, lost: Mapping[Change, float]) -> Effect:
    """Return what losses (fractions: 0.01 is a point) do at constant thrust.

    Raises OutOfRangeError for a loss outside -2 to 8 %, NoSolutionError where the solved cycle has no root.
    """
    check_lost(lost, spools=matrix.path.spools)
    summed = [(matrix.of(change), share / POINT) for change, share in lost.items()]
    linear = Effect(
        sum(c.egt_K.value * points for c, points in summed),
        sum(c.fuel_takeoff_frac.value * points for c, points in summed),
        sum(c.fuel_cruise_frac.value * points for c, points in summed),
        False,
    )
    return linear if abs(linear.egt_K) <= LINEAR_LIMIT_K else solved_effect(matrix, lost)


def solved_effect(matrix: Matrix, lost: Mapping[Change, float]) -> Effect:
    """Return the same by solving the worn engine, whatever the size."""
    path, conditions = matrix.path, matrix.conditions
    hot = takeoff(path, thrust_frac=conditions.takeoff_thrust_frac, ambient_K=conditions.corner_point_K, lost=lost)
    high = cruise(
        path,
        height_m=conditions.cruise_height_m,
        mach=conditions.cruise_mach,
        thrust_N=conditions.cruise_thrust_frac * path.thrust_N,
        lost=lost,
    )
    turbines = hot.walk.turbines
    egt = turbines.lpt_inlet if matrix.station == LPT_INLET else turbines.lpt_exit
    return Effect(
        float(egt.temperature[0]) - matrix.egt_K,
        float(hot.walk.fuel_flow[0]) / matrix.takeoff_fuel_kg_per_s - 1.0,
        float(high.walk.fuel_flow[0]) / matrix.cruise_fuel_kg_per_s - 1.0,
        True,
    )


def degC_per_point(matrix: Matrix, components: Sequence[str], *, flow_frac_per_eff_frac: float = 0.0) -> PerPoint:
    """Return what one point of efficiency lost in every component of a module takes in margin and cruise fuel.

    ``flow_frac_per_eff_frac`` adds the flow that is lost with it: a compressor's capacity, the combustor's pressure, a
    turbine's throat opened. Raises RequestError where the module has no component of this engine, or where its loss
    does not heat the engine (a combustor's efficiency alone), so that degrees cannot stand for it.
    """
    degC = fuel = 0.0
    for component in components:
        for kind, weight in ((EFFICIENCY, 1.0), (_FLOW_KIND.get(component, ""), flow_frac_per_eff_frac)):
            if weight != 0.0:
                try:
                    coefficient = matrix.of(Change(component, kind))
                except KeyError:
                    have = sorted({c.change.component for c in matrix.coefficients})
                    raise RequestError("component of the gas path", component, ", ".join(have)) from None
                degC += coefficient.egt_K.value * weight
                fuel += coefficient.fuel_cruise_frac.value * weight
    if degC <= 0.0:
        raise RequestError(
            "module's lost efficiency",
            f"{degC:.2f} degC a point",
            "a loss that heats the engine",
            "give its wear in degC",
        )
    return PerPoint(degC, fuel)
