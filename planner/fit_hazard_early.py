"""How many of the builds fail early: the chance of a failure within so many cycles of a build, from censored records.

Product-limit estimate (Kaplan and Meier, *J. American Statistical Association* 53, 1958) with limits on the scale of
``log(-log survival)``, which keeps them between 0 and 1 (Kalbfleisch and Prentice, *The Statistical Analysis of Failure
Time Data*, 1980, ch. 1).
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from scipy.stats import norm

from planner.fit_hazard import CONFIDENCE, Lives
from sim.errors import NoSolutionError


class EarlyChance(NamedTuple):
    """The chance of a failure within the cycles, its interval, failures in them, and builds followed beyond them."""

    chance: float
    low: float
    high: float
    failures: int
    followed: int


def early_chance(builds: Lives, *, within: float, confidence: float = CONFIDENCE) -> EarlyChance:
    """Return the chance of an early failure; ages are counted from each build.

    Without a failure the upper limit is one-sided. Raises NoSolutionError when no build was followed from early on.
    """
    ages = np.where(builds.failed, builds.high, builds.low)
    strikes = builds.failed & (ages <= within)
    failures = int(strikes.sum())
    followed = int(((ages >= within) & (builds.entry < within)).sum()) + failures
    if followed == 0:
        raise NoSolutionError("chance of an early failure", f"no build was followed for {within:g} cycles")
    if failures == 0:
        return EarlyChance(0.0, 0.0, -math.expm1(math.log(1.0 - confidence) / followed), 0, followed)
    log_survival, variance = 0.0, 0.0
    for age in np.unique(ages[strikes]):
        at_risk = int(((builds.entry < age) & (ages >= age)).sum())
        failed = int((strikes & (ages == age)).sum())
        if failed == at_risk:
            return EarlyChance(1.0, (1.0 - confidence) ** (1.0 / failures), 1.0, failures, followed)
        log_survival += math.log1p(-failed / at_risk)
        variance += failed / (at_risk * (at_risk - failed))
    spread = float(norm.ppf(0.5 + confidence / 2.0)) * math.sqrt(variance) / -log_survival
    low, high = (-math.expm1(log_survival * math.exp(sign * spread)) for sign in (-1.0, 1.0))
    return EarlyChance(-math.expm1(log_survival), low, high, failures, followed)
