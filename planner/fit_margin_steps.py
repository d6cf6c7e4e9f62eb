"""Lasting steps in a margin trend that no record explains: found, sized and dated between two readings.

Forward search: at every gap between readings the gain in fit by a step there is a squared normal deviate if there is
none; the largest is taken when it could hardly be luck at any of the gaps (Bonferroni), the trend is fitted anew, and
the search goes on. A step wants three readings on either side, so that an outlier at the end is not taken for one.
"""

from __future__ import annotations

from itertools import pairwise
from typing import NamedTuple

import numpy as np
from scipy.stats import norm

from planner.fit_margin import (
    GAIN,
    Array,
    MarginFit,
    Prior,
    Stretch,
    columns,
    fit_stretch,
    precision,
    settled,
    solve,
)

FALSE_ALARM_CHANCE = 0.05
LEAST_READINGS = 3
MOST_STEPS = 6


class Step(NamedTuple):
    """One step: first reading after it (cycles), the days of the readings on either side, size with its 95 % interval
    in degC (positive: margin gained), and whether the records name a swap there."""

    cycles: float
    from_day: float
    to_day: float
    size_degC: float
    low_degC: float
    high_degC: float
    recorded: bool


def found_steps(stretch: Stretch, prior: Prior, *, noise_degC: float) -> tuple[float, ...]:
    """Return the cycles at which steps begin that no record explains, in order."""
    found: list[float] = []
    gaps = max(1, len(stretch.cycles) - 2 * LEAST_READINGS + 1)
    limit = float(norm.isf(FALSE_ALARM_CHANCE / 2.0 / gaps))
    while len(found) < MOST_STEPS:
        at, deviate = _best_gap(stretch, prior, tuple(found), noise=noise_degC)
        if at is None or abs(deviate) < limit:
            break
        fit = fit_stretch(stretch, prior, noise_degC=noise_degC, steps=(*found, at))
        where = GAIN + 1 + fit.steps.index(at)
        # once the step is in, weights settle anew: what was an outlier's doing falls below the limit again
        if abs(fit.coefficients[where]) < limit * np.sqrt(fit.covariance[where, where]):
            break
        found.append(at)
    return tuple(sorted(found))


def _best_gap(stretch: Stretch, prior: Prior, found: tuple[float, ...], *, noise: float) -> tuple[float | None, float]:
    """Return the gap (cycles of the reading after it) where one more step gains most, and its normal deviate."""
    steps = tuple(sorted({*stretch.known_steps, *found}))
    candidates = _candidates(stretch.cycles, steps)
    if not len(candidates):
        return None, 0.0
    rows = columns(stretch, stretch.cycles, steps)
    known = precision(prior, len(steps))
    weights = settled(rows, stretch.margin_degC, noise=noise, prior=known, gentle=True)
    residuals = stretch.margin_degC - rows @ solve(rows, stretch.margin_degC, weights, noise=noise, prior=known)
    step = (stretch.cycles[:, None] >= candidates[None, :]).astype(float)
    weighted = step.T * weights / noise**2
    matrix = (rows.T * weights) @ rows / noise**2 + np.diag(known[0])
    cross = weighted @ rows
    left = np.einsum("ij,ji->i", weighted, step) - np.einsum("ij,ij->i", cross, np.linalg.solve(matrix, cross.T).T)
    deviates = (weighted @ residuals) / np.sqrt(np.maximum(left, 1e-12))
    best = int(np.argmax(np.abs(deviates)))
    return float(candidates[best]), float(deviates[best])


def _candidates(cycles: Array, steps: tuple[float, ...]) -> Array:
    """Return the cycles of readings that have enough readings before and from them on, up to the next step."""
    edges = [0, *(int(np.searchsorted(cycles, step)) for step in steps), len(cycles)]
    chosen = [
        cycles[first + LEAST_READINGS : last - LEAST_READINGS + 1]
        for first, last in pairwise(edges)
        if last - first >= 2 * LEAST_READINGS
    ]
    return np.unique(np.concatenate(chosen)) if chosen else np.empty(0)


def sized(fit: MarginFit) -> list[Step]:
    """Return a fit's steps with size, interval and the days between which each happened."""
    result = []
    for number, cycles in enumerate(fit.steps):
        size, low, high = fit.interval(GAIN + 1 + number)
        after = min(int(np.searchsorted(fit.stretch.cycles, cycles)), len(fit.stretch.cycles) - 1)
        before = max(0, after - 1)
        result.append(
            Step(
                cycles=cycles,
                from_day=float(fit.stretch.days[before]),
                to_day=float(fit.stretch.days[after]),
                size_degC=size,
                low_degC=low,
                high_degC=high,
                recorded=cycles in fit.stretch.known_steps,
            )
        )
    return result
