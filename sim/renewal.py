"""Renewals: how many failures to expect by an age when each failure is answered with a new life.

``M(t) = F(t) + integral of M(t - s) dF(s)``, the renewal equation (Barlow and Proschan, *Mathematical Theory of
Reliability*, 1965, ch. 3). Solved on a grid by the Riemann-Stieltjes rule with midpoints (Xie, "On the solution of
renewal-type integral equations", *Communications in Statistics - Simulation* 18, 1989), which needs only the
distribution itself, so that a density that is infinite at zero does no harm; two grids and Richardson's step take the
leading error away.
"""

from __future__ import annotations

import math

import numpy as np
from numpy.typing import NDArray

from sim.errors import RequestError

STEPS = 400


def renewals(ages: NDArray[np.float64] | float, *, shape: float, scale: float) -> NDArray[np.float64]:
    """Return the expected number of renewals by each age (same unit as ``scale``; 0 for an age of 0).

    Not decreasing in age. Raises RequestError for a shape or scale that is not above zero or a negative age.
    """
    wanted = np.atleast_1d(np.asarray(ages, dtype=float))
    if not (shape > 0.0 and scale > 0.0 and math.isfinite(shape) and math.isfinite(scale)):
        raise RequestError("renewals", f"shape {shape:g}, scale {scale:g}", "both above zero")
    if wanted.size and not (wanted.min() >= 0.0 and math.isfinite(wanted.max())):
        raise RequestError("renewals", f"an age of {wanted.min():g}", "ages of zero or more")
    if shape == 1.0:
        return wanted / scale
    return np.array([_at(age / scale, shape) for age in wanted])


def _at(age: float, shape: float) -> float:
    """Return M at one age in units of the scale."""
    if age == 0.0:
        return 0.0
    # enough steps to follow each of the lives that fit into the age
    steps = STEPS * max(1, math.ceil(age))
    # the rule's error falls with the square of the step, more slowly where the density is infinite at zero
    order = min(2.0, 1.0 + shape)
    coarse, fine = _solve(age, shape, steps), _solve(age, shape, 2 * steps)
    return fine + (fine - coarse) / (math.pow(2.0, order) - 1.0)


def _solve(age: float, shape: float, steps: int) -> float:
    """Return M at ``age`` on a grid of so many steps."""
    grid = np.linspace(0.0, age, steps + 1)
    whole = -np.expm1(-(grid**shape))
    middle = -np.expm1(-((grid[:-1] + 0.5 * age / steps) ** shape))
    found = np.zeros(steps + 1)
    # M_i = F_i + sum over j of F(t_i - middle of step j) (M_j - M_(j-1)), solved for M_i; M_0 = 0
    weights = np.diff(middle)[::-1]
    for i in range(1, steps + 1):
        found[i] = (whole[i] + found[1:i] @ weights[steps - i :]) / (1.0 - middle[0])
    return float(found[-1])
