"""How long an engine is expected to stay on: the planned removal, cut short by the chance causes.

With S(c) the chance that no chance cause has struck within c cycles, the expected run is the integral of S from 0 to
the planned removal. S multiplies over modules and causes; each is a Weibull conditional on the age reached.
"""

from __future__ import annotations

import math
from collections.abc import Iterable

import numpy as np

from sim import hazard
from sim.state import Flying, ModuleState

_POINTS = 65  # Simpson's rule; the curves are smooth, and 65 points give six digits


def chance_of_no_removal(modules: Iterable[ModuleState], flying: Flying, *, cycles: float) -> float:
    """Return the chance that no chance cause takes the engine off within so many cycles."""
    used = 0.0
    for module in modules:
        for one in module.hazards():
            scale = hazard.scale_in(flying.environment, one.scale, one.exponent)
            age = module.age(one)
            ahead = cycles * flying.hours_per_cycle if one.hours else cycles
            used += hazard.cumulative(age + ahead, one.shape, scale) - hazard.cumulative(age, one.shape, scale)
        used += _early(module, cycles)
    return math.exp(-used)


def expected_run_cycles(modules: Iterable[ModuleState], flying: Flying, *, planned_cycles: float) -> float:
    """Return the expected cycles to the next removal, planned or not; never more than the planned ones."""
    if planned_cycles <= 0.0:
        return 0.0
    kept = list(modules)
    grid = np.linspace(0.0, planned_cycles, _POINTS)
    alive = np.array([chance_of_no_removal(kept, flying, cycles=float(c)) for c in grid])
    weights = np.ones(_POINTS)
    weights[1:-1:2], weights[2:-1:2] = 4.0, 2.0
    return float((weights * alive).sum() * planned_cycles / (_POINTS - 1) / 3.0)


def _early(module: ModuleState, cycles: float) -> float:
    """Return the hazard of an early failure after the last build, spread evenly over its span."""
    spec = module.spec.early
    if spec is None or module.csb >= spec.ends_after:
        return 0.0
    gone = spec.probability * module.csb / spec.ends_after
    after = spec.probability * min(module.csb + cycles, spec.ends_after) / spec.ends_after
    return -math.log1p(-(after - gone) / (1.0 - gone))
