"""Weibull hazards on plain floats: how much hazard an age has used up, and at which age a budget is spent.

A chance cause is drawn once as a budget of cumulative hazard, ``-ln U`` (an exponential of mean one). The cause strikes
at the age at which the hazard gathered since then equals the budget. That is the inverse of the survival function
conditional on age, and it stays exact when the scale changes in mid-life (another base): what was used is taken off the
budget. Weibull: ``H(a) = (a / scale) ** shape``; shape 1 is the exponential. Textbook results, e.g. Lawless,
*Statistical Models and Methods for Lifetime Data*, 2003, ch. 1.
"""

from __future__ import annotations

import math


def cumulative(age: float, shape: float, scale: float) -> float:
    """Return the cumulative hazard at an age, in the scale's unit."""
    ratio = age / scale
    return ratio if shape == 1.0 else math.pow(ratio, shape)


def age_when(budget: float, age: float, shape: float, scale: float) -> float:
    """Return the age at which the hazard gathered since ``age`` reaches ``budget`` (not below ``age``)."""
    if shape == 1.0:
        return age + budget * scale
    return max(age, scale * math.pow(math.pow(age / scale, shape) + budget, 1.0 / shape))


def scale_in(environment: float, scale: float, exponent: float) -> float:
    """Return the scale in an environment: life is divided by the environment to a power."""
    return scale if exponent == 0.0 or environment == 1.0 else scale / math.pow(environment, exponent)


def survival(age: float, ahead: float, shape: float, scale: float) -> float:
    """Return the chance to live ``ahead`` longer, given ``age``."""
    return math.exp(cumulative(age, shape, scale) - cumulative(age + ahead, shape, scale))


def quantile_ahead(chance: float, age: float, shape: float, scale: float) -> float:
    """Return the time ahead within which the cause strikes with that chance, given ``age``."""
    return age_when(-math.log1p(-chance), age, shape, scale) - age
