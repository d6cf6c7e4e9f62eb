"""A margin trend carried forward: band, when it meets the removal margin, and the chance to hold until a day.

The band is that of the margin itself, not of one more reading. With washes to come the margin has teeth and the first
crossing counts, so their lowest points are carried forward. The chance to have met the threshold by c cycles is the
normal probability that the margin at c lies below it, never falling again; dates are where it passes 10, 50 and 90 %.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import NamedTuple

import numpy as np
from scipy.stats import norm

from planner.fit_margin import Z95, Array, MarginFit

CHANCES = (0.1, 0.5, 0.9)
_POINTS = 800


class Band(NamedTuple):
    """Margin at each of the cycles with the ends of its 95 % band, degC."""

    cycles: Array
    margin_degC: Array
    low_degC: Array
    high_degC: Array


def tooth_floor(*, every_cycles: float | None, half_life_cycles: float) -> float:
    """Return the share of a wash's gain left when the next wash comes (0 without washes to come)."""
    return 0.0 if every_cycles is None else math.exp2(-every_cycles / half_life_cycles)


def band(fit: MarginFit, cycles: Array, *, gain_floor: float = 0.0) -> Band:
    """Return the margin with its band at cycles since installation."""
    mean, spread = fit.at(cycles, gain_floor=gain_floor)
    return Band(np.asarray(cycles, dtype=float), mean, mean - Z95 * spread, mean + Z95 * spread)


def chance_met(fit: MarginFit, threshold_degC: float, cycles: Array, *, gain_floor: float = 0.0) -> Array:
    """Return the chance that the margin has met the threshold by each of the rising cycles."""
    mean, spread = fit.at(cycles, gain_floor=gain_floor)
    deviates = (threshold_degC - mean) / np.maximum(spread, 1e-9)
    return np.asarray(np.maximum.accumulate(norm.cdf(deviates)))


def crossings(
    fit: MarginFit, threshold_degC: float, *, now_cycles: float, reach_cycles: float, gain_floor: float = 0.0
) -> tuple[float | None, ...]:
    """Return the cycles since installation by which the threshold has been met with 10, 50 and 90 % chance.

    None where that lies beyond ``reach_cycles`` more; ``now_cycles`` where it is so already.
    """
    grid = now_cycles + reach_cycles * np.linspace(0.0, 1.0, _POINTS) ** 2
    met = chance_met(fit, threshold_degC, grid, gain_floor=gain_floor)

    def first(chance: float) -> float | None:
        if met[-1] < chance:
            return None
        i = int(np.argmax(met >= chance))
        if i == 0:
            return now_cycles
        share = (chance - met[i - 1]) / max(met[i] - met[i - 1], 1e-300)
        return float(grid[i - 1] + share * (grid[i] - grid[i - 1]))

    return tuple(first(chance) for chance in CHANCES)


def in_days(cycles: tuple[float | None, ...], day_of: Callable[[float], float]) -> tuple[float | None, ...]:
    """Return days for cycles, None staying None."""
    return tuple(None if at is None else day_of(at) for at in cycles)
