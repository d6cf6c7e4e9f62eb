"""EGT against ambient temperature, derate and rating, and the hottest ambient that keeps the redline."""

from __future__ import annotations

import numpy as np

from sim.atmosphere import SEA_LEVEL_PA
from sim.cycle import THRUST_RANGE
from sim.cycle_design import designed
from sim.cycle_inputs import Flight, GasPath
from sim.cycle_offdesign import solve, tiled
from sim.errors import NoSolutionError, OutOfRangeError
from sim.gas import Values
from sim.influence import LPT_INLET, Matrix


def takeoff_egt(path: GasPath[float], *, station: str, ambient_K: Values, thrust_frac: Values) -> Values:
    """Return take-off EGT in K at ambient temperatures and shares of rated thrust, both of shape (n,).

    Raises OutOfRangeError for a share outside 0.6 to 1.1, NoSolutionError where a point has no acceptable root.
    """
    outside = (thrust_frac < THRUST_RANGE[0]) | (thrust_frac > THRUST_RANGE[1])
    if outside.any():
        raise OutOfRangeError("share of rated thrust", f"{thrust_frac[outside][0]:.3f}", "0.6 to 1.1")
    count = ambient_K.shape[0]
    flight = Flight(ambient_K, np.full(count, SEA_LEVEL_PA), np.zeros(count))
    state = solve(tiled(designed(path), count), flight=flight, thrust_N=thrust_frac * path.thrust_N, lost={})
    if not state.solved.all():
        first = int(np.argmin(state.solved))
        raise NoSolutionError("take-off EGT", f"no acceptable root at {ambient_K[first]:.1f} K ambient")
    turbines = state.walk.turbines
    return (turbines.lpt_inlet if station == LPT_INLET else turbines.lpt_exit).temperature


def hottest_ambient(*, corner_point_degC: float, margin_degC: float, egt_per_ambient: float) -> float:
    """Return the hottest ambient in degC at which full rated thrust keeps the redline: ``T_corner + margin / k``."""
    return corner_point_degC + margin_degC / egt_per_ambient


def solved_hottest_ambient(matrix: Matrix, *, margin_K: float) -> float:
    """Return the same in K from the cycle: where EGT at the rating's thrust is a margin above the corner point's.

    Raises NoSolutionError where the answer lies beyond 45 K either side of the corner point.
    """
    corner = matrix.conditions.corner_point_K
    ambient = np.linspace(corner - 45.0, corner + 45.0, 46)
    share = np.full_like(ambient, matrix.conditions.takeoff_thrust_frac)
    egt = takeoff_egt(matrix.path, station=matrix.station, ambient_K=ambient, thrust_frac=share) - matrix.egt_K
    if not egt[0] <= margin_K <= egt[-1]:
        raise NoSolutionError("hottest ambient", f"a margin of {margin_K:g} K lies beyond 45 K from the corner point")
    return float(np.interp(margin_K, egt, ambient))
