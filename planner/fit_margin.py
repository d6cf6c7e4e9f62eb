"""An engine's margin from its readings: level, rate, early loss and washes by robust regression on one stretch.

A stretch is what one engine flew between a visit and the next. With c cycles since installation the margin is::

    level - rate * f * c / 1000 - early * g * (1 - exp(-c / tau)) + gain * w(c) + steps before c

f and g carry what is known to make this engine wear faster than the reference (environment, derate, hours a cycle), tau
is the wear table's, w fades from 1 at each wash by its half-life and does not stack, and a step is a lasting change
between two readings. Noise is normal with outliers: reweighted least squares with the bisquare (Beaton and Tukey,
*Technometrics* 16, 1974) started from Huber's weights, at a noise level that is known or pooled, so that the answer
does not depend on where it starts. Rate, early loss and gain have a normal prior, which is how an engine with few
readings borrows from its type (planner/fit_margin_pool.py); the level has none.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

Array = NDArray[np.float64]

POOLED = ("rate", "early", "gain")
LEVEL, RATE, EARLY, GAIN = range(4)
# Tuning constants for 95 % efficiency under normal noise (Huber, *Robust Statistics*, 1981; Beaton and Tukey, 1974).
HUBER, BISQUARE = 1.345, 4.685
LEAST_TO_REJECT = 8
MOST_ROUNDS = 15
# A reading whose bisquare weight is below this stands more than four deviations off.
OUTLIER_WEIGHT = 0.07
# A step is known only to be no more than tens of degrees; this keeps a step without readings after it from floating.
STEP_SPREAD_DEGC = 30.0
# A median absolute deviation tells as much of the noise as a standard deviation of so many fewer differences (Huber,
# *Robust Statistics*, 1981); the believed noise counts as so many.
MEDIAN_EFFICIENCY, NOISE_BELIEF = 0.37, 10.0
# Half-width of a normal's central 95 %.
Z95 = 1.959963984540054


class Stretch(NamedTuple):
    """One engine's readings between two visits: cycles since installation (rising), day, margin, and what is known of
    its use. ``washes`` holds the cycles at which it was washed, ``known_steps`` those at which a module was swapped."""

    engine_serial: str
    cycles: Array
    days: Array
    margin_degC: Array
    rate_factor: float = 1.0
    early_factor: float = 1.0
    early_scale_cycles: float = 700.0
    half_life_cycles: float = 300.0
    washes: tuple[float, ...] = ()
    known_steps: tuple[float, ...] = ()


class Prior(NamedTuple):
    """What is believed of rate (degC per 1,000 cycles), early loss and wash gain (degC): means, deviations between
    engines, and the covariance of the means themselves."""

    mean: Array
    spread: Array
    mean_covariance: Array


class MarginFit(NamedTuple):
    """A fitted stretch: coefficients (level, rate, early, gain, then one a step), their covariance, each reading's
    weight, the cycles of the steps, and the noise of one reading in degC."""

    stretch: Stretch
    coefficients: Array
    covariance: Array
    weights: Array
    steps: tuple[float, ...]
    noise_degC: float

    def at(self, cycles: Array | float, *, gain_floor: float = 0.0) -> tuple[Array, Array]:
        """Return margin and its standard deviation at cycles since installation; at least ``gain_floor`` of a wash's
        gain is left (washes to come keep the lowest point of each tooth there)."""
        rows = columns(self.stretch, np.atleast_1d(np.asarray(cycles, dtype=float)), self.steps)
        rows[:, GAIN] = np.maximum(rows[:, GAIN], gain_floor)
        mean = rows @ self.coefficients
        variance = np.einsum("ij,jk,ik->i", rows, self.covariance, rows)
        return mean, np.sqrt(np.maximum(variance, 0.0))

    def interval(self, which: int) -> tuple[float, float, float]:
        """Return a coefficient with its 95 % interval."""
        value, spread = float(self.coefficients[which]), float(np.sqrt(self.covariance[which, which]))
        return value, value - Z95 * spread, value + Z95 * spread

    @property
    def outliers(self) -> int:
        return int((self.weights < OUTLIER_WEIGHT).sum())


def fading(cycles: Array, washes: tuple[float, ...], half_life_cycles: float) -> Array:
    """Return what is left of the last wash (1 just after it, 0 before the first)."""
    if not washes:
        return np.zeros_like(cycles)
    at = np.sort(np.asarray(washes, dtype=float))
    last = np.searchsorted(at, cycles, side="right") - 1
    since = cycles - at[np.maximum(last, 0)]
    return np.where(last >= 0, np.exp2(-np.maximum(since, 0.0) / half_life_cycles), 0.0)


def columns(stretch: Stretch, cycles: Array, steps: tuple[float, ...]) -> Array:
    """Return the regression's columns at those cycles: level, rate, early loss, gain, then the steps."""
    fixed = [
        np.ones_like(cycles),
        -stretch.rate_factor * cycles / 1000.0,
        stretch.early_factor * np.expm1(-cycles / stretch.early_scale_cycles),
        fading(cycles, stretch.washes, stretch.half_life_cycles),
    ]
    return np.column_stack([*fixed, *((cycles >= step).astype(float) for step in steps)])


def precision(prior: Prior, steps: int) -> tuple[Array, Array]:
    """Return the prior's precision and mean for all coefficients; the level is free."""
    weights = np.concatenate([[0.0], prior.spread**-2.0, np.full(steps, STEP_SPREAD_DEGC**-2.0)])
    return weights, np.concatenate([[0.0], prior.mean, np.zeros(steps)])


def solve(rows: Array, margin: Array, weights: Array, *, noise: float, prior: tuple[Array, Array]) -> Array:
    """Return the coefficients of weighted least squares with a prior."""
    matrix = (rows.T * weights) @ rows / noise**2 + np.diag(prior[0])
    side = (rows.T * weights) @ margin / noise**2 + prior[0] * prior[1]
    return np.asarray(np.linalg.solve(matrix, side))


def huber_weights(residuals: Array, *, cut: float = HUBER) -> Array:
    return np.minimum(1.0, cut / np.maximum(np.abs(residuals), 1e-300))


def bisquare_weights(residuals: Array) -> Array:
    return np.square(np.maximum(1.0 - np.square(residuals / BISQUARE), 0.0))


def settled(rows: Array, margin: Array, *, noise: float, prior: tuple[Array, Array], gentle: bool = False) -> Array:
    """Return the readings' weights once reweighting has settled; ``gentle`` stops at Huber's, which keep every reading.

    Huber's weights stand too where there are too few readings to say which one is wrong, and should the bisquare throw
    away more than half of them.
    """
    hubers = _reweighted(rows, margin, np.ones_like(margin), huber_weights, noise=noise, prior=prior)
    if gentle or len(margin) < LEAST_TO_REJECT:
        return hubers
    weights = _reweighted(rows, margin, hubers, bisquare_weights, noise=noise, prior=prior)
    return weights if weights.sum() >= 0.5 * len(margin) else hubers


def _reweighted(
    rows: Array,
    margin: Array,
    weights: Array,
    law: Callable[[Array], Array],
    *,
    noise: float,
    prior: tuple[Array, Array],
) -> Array:
    """Return the weights after reweighting until they hardly move."""
    for _ in range(MOST_ROUNDS):
        residuals = (margin - rows @ solve(rows, margin, weights, noise=noise, prior=prior)) / noise
        moved = law(residuals)
        change = float(np.max(np.abs(moved - weights)))
        weights = moved
        if change < 1e-3:
            break
    return weights


def fit_stretch(stretch: Stretch, prior: Prior, *, noise_degC: float, steps: tuple[float, ...] = ()) -> MarginFit:
    """Return the robust fit of a stretch under a prior, with steps at the known swaps and at ``steps``."""
    every = tuple(sorted({*stretch.known_steps, *steps}))
    rows = columns(stretch, stretch.cycles, every)
    known = precision(prior, len(every))
    weights = settled(rows, stretch.margin_degC, noise=noise_degC, prior=known)
    coefficients = solve(rows, stretch.margin_degC, weights, noise=noise_degC, prior=known)
    inverse = np.linalg.inv((rows.T * weights) @ rows / noise_degC**2 + np.diag(known[0]))
    # the prior's means were estimated too: their uncertainty reaches as far as the prior does (Kass and Steffey, *J.
    # American Statistical Association* 84, 1989, first order)
    pull = inverse[:, RATE : GAIN + 1] * known[0][RATE : GAIN + 1]
    covariance = inverse + pull @ prior.mean_covariance @ pull.T
    return MarginFit(stretch, coefficients, covariance, weights, every, noise_degC)


def information(fit: MarginFit) -> tuple[Array, Array]:
    """Return what a stretch's readings say of (rate, early, gain) once level and steps are free: precision and its
    product with the estimate (3 x 3, 3)."""
    rows = columns(fit.stretch, fit.stretch.cycles, fit.steps)
    weighted = (rows.T * fit.weights) / fit.noise_degC**2
    matrix, side = weighted @ rows, weighted @ fit.stretch.margin_degC
    pooled = [RATE, EARLY, GAIN]
    free = [LEVEL, *range(GAIN + 1, rows.shape[1])]
    inner = matrix[np.ix_(free, free)] + np.diag([1e-9] + [STEP_SPREAD_DEGC**-2.0] * (len(free) - 1))
    cross = np.linalg.solve(inner, matrix[np.ix_(free, pooled)])
    return (
        matrix[np.ix_(pooled, pooled)] - matrix[np.ix_(pooled, free)] @ cross,
        side[pooled] - cross.T @ side[free],
    )


def noise_of(stretches: list[Stretch], *, believed: float) -> float:
    """Return the noise of one reading in degC from the differences of neighbours, robust against trends, steps and
    outliers, and drawn to what is believed of it where the differences are few."""
    found = []
    for stretch in stretches:
        steps = np.diff(stretch.margin_degC)
        quiet = np.ones(len(steps), dtype=bool)
        for cycles in (*stretch.washes, *stretch.known_steps):
            quiet &= ~((stretch.cycles[:-1] < cycles) & (cycles <= stretch.cycles[1:]))
        if quiet.sum() >= 3:
            found.append(steps[quiet] - np.median(steps[quiet]))
    if not found:
        return believed
    every = np.concatenate(found)
    # 1.4826: a normal's deviation from its median absolute deviation; root 2: a difference holds two readings
    spread = 1.4826 * float(np.median(np.abs(every))) / math.sqrt(2.0)
    own = MEDIAN_EFFICIENCY * len(every)
    return max(0.05, math.sqrt((own * spread**2 + NOISE_BELIEF * believed**2) / (own + NOISE_BELIEF)))
