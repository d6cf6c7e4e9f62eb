"""At which age is it best to replace what wears out, when a failure costs more than a planned replacement?

Replacing at age T or at failure, whichever comes first, costs on average a unit of time
``C(T) = (planned R(T) + failed F(T)) / integral of R from 0 to T``. Its least value stands where
``h(T) * integral of R - F(T) = planned / (failed - planned)``, and is ``(failed - planned) h(T)`` (Barlow and Proschan,
*Mathematical Theory of Reliability*, 1965, ch. 4). With a hazard that rises there is one such age; else replacing early
never pays.
"""

from __future__ import annotations

import math
from typing import NamedTuple

from scipy.optimize import brentq
from scipy.special import gammainc

from sim.errors import RequestError


class Replacement(NamedTuple):
    """The best age (None: wait for the failure), its cost a unit of time, that of waiting, and the share that fails."""

    age: float | None
    cost_rate: float
    waiting_cost_rate: float
    failed_frac: float


def best_age(*, shape: float, scale: float, planned_cost: float, failed_cost: float) -> Replacement:
    """Return the best age to replace at, in the unit of ``scale``.

    Raises RequestError for costs, shape or scale that are not above zero.
    """
    figures = {"shape": shape, "scale": scale, "planned cost": planned_cost, "cost of a failure": failed_cost}
    for what, value in figures.items():
        if not (value > 0.0 and math.isfinite(value)):
            raise RequestError(what, f"{value:g}", "a number above zero")
    mean = scale * math.gamma(1.0 + 1.0 / shape)
    waiting = failed_cost / mean
    if shape <= 1.0 or failed_cost <= planned_cost:
        return Replacement(None, waiting, waiting, 1.0)
    target = planned_cost / (failed_cost - planned_cost)

    def gap(log_age: float) -> float:
        hazard = math.exp(shape * log_age)  # in ages of the scale: h T = k H, and the mean life lived by T is ...
        lived = math.gamma(1.0 + 1.0 / shape) * float(gammainc(1.0 / shape, hazard))
        return shape * math.exp((shape - 1.0) * log_age) * lived + math.expm1(-hazard) - target

    top = 1.0
    while gap(top) < 0.0:
        top += 1.0
        if top > 200.0:
            return Replacement(None, waiting, waiting, 1.0)
    bottom = -1.0
    while gap(bottom) > 0.0:
        bottom -= 2.0
    log_age = float(brentq(gap, bottom, top, xtol=1e-13))
    rate = (failed_cost - planned_cost) * shape / scale * math.exp((shape - 1.0) * log_age)
    fails = -math.expm1(-math.exp(shape * log_age))
    if fails > 1.0 - 1e-9:
        # so late that nothing would live to see it
        return Replacement(None, waiting, waiting, 1.0)
    return Replacement(scale * math.exp(log_age), rate, waiting, fails)
