"""Weibull and exponential lives from records that are censored, with intervals.

A life is followed from an age at entry (what happened before is not in the records: left truncation) until it failed
at a known age (exact), between two looks (interval censored), or was last seen alive (right censored). With cumulative
hazard ``H(t) = L t^k``, ``L = scale^-k``, the log-likelihood is::

    exact:     log h(t) - H(t) + H(entry)
    right:     -H(t) + H(entry)
    interval:  log(exp(-H(low)) - exp(-H(high))) + H(entry)

For a shape k it is concave in log L, so L is profiled out and one search over log k is left. Intervals invert the
likelihood ratio (Meeker and Escobar, *Statistical Methods for Reliability Data*, 1998, ch. 8; Lawless, *Statistical
Models and Methods for Lifetime Data*, 2003, ch. 5). With few failures the shape is held and the scale has Poisson
limits (Nelson, "Weibull analysis of reliability data with few or no failures", *J. Quality Technology* 17, 1985).
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq, minimize_scalar
from scipy.stats import chi2

from sim.errors import NoSolutionError, RequestError

Array = NDArray[np.float64]

CONFIDENCE = 0.95
# Shapes of the trade lie between 0.2 and 6 (TRADE.md); beyond these ends the records hold no finite answer.
SHAPE_RANGE = (0.05, 60.0)


class Lives(NamedTuple):
    """Lives as arrays of equal length, in the clock's unit: ages at entry, last seen alive, and known to have failed.

    ``high`` equals ``low`` for an exact failure and is infinite for a life that was never seen to fail.
    """

    entry: Array
    low: Array
    high: Array

    @property
    def exact(self) -> NDArray[np.bool_]:
        return np.asarray(self.high == self.low)

    @property
    def failed(self) -> NDArray[np.bool_]:
        return np.isfinite(self.high)

    @property
    def failures(self) -> int:
        return int(self.failed.sum())

    @property
    def censored(self) -> int:
        return len(self.low) - self.failures

    @property
    def between(self) -> int:
        """How many failures are known only to lie between two looks."""
        return int((self.failed & ~self.exact).sum())


class Fit(NamedTuple):
    """A fitted life. ``held``: the shape was not estimated. An interval's end is None where the records set none."""

    shape: float
    scale: float | None
    shape_low: float | None
    shape_high: float | None
    scale_low: float | None
    scale_high: float | None
    log_likelihood: float
    failures: int
    censored: int
    held: bool


def lives(
    ends: Sequence[float] | Array,
    failed: Sequence[bool] | NDArray[np.bool_],
    *,
    entries: Sequence[float] | Array | None = None,
    last_good: Sequence[float] | Array | None = None,
) -> Lives:
    """Return lives that end at ``ends``, failed or not; NaN in ``last_good`` is an exact age.

    A failure at no age or in the cycle of its entry is put half a unit after it; lives of no length drop out. Raises
    RequestError for ages that are not numbers, negative, or out of order.
    """
    end = np.array(ends, dtype=float)
    fails = np.array(failed, dtype=bool)
    entry = np.zeros_like(end) if entries is None else np.array(entries, dtype=float)
    good = np.full_like(end, np.nan) if last_good is None else np.array(last_good, dtype=float)
    for what, ages in (("age at the end", end), ("age at entry", entry)):
        bad = ~(np.isfinite(ages) & (ages >= 0.0))
        if bad.any():
            raise RequestError(what, f"{ages[bad][0]:g}", "a number of zero or more", "mend removals.csv")
    if (end < entry).any():
        i = int(np.argmax(end < entry))
        raise RequestError("age at the end", f"{end[i]:g}", f"at least the age at entry, {entry[i]:g}")
    late = np.isfinite(good) & (good > end)
    if late.any():
        i = int(np.argmax(late))
        raise RequestError("age last seen good", f"{good[i]:g}", f"at most the age at the end, {end[i]:g}")
    end = np.where(fails & (end <= entry), entry + 0.5, end)
    between = fails & np.isfinite(good) & (good < end)
    low = np.where(between, np.maximum(good, entry), end)
    high = np.where(fails, end, np.inf)
    kept = fails | (end > entry)
    return Lives(entry[kept], low[kept], high[kept])


class _Likelihood:
    """The log-likelihood of lives, profiled over the rate; ages are scaled to the longest so that powers stay small."""

    __slots__ = ("_exact", "count", "entry", "exact_logs", "high", "low", "unit")

    def __init__(self, data: Lives) -> None:
        between = data.failed & ~data.exact
        self.unit = float(np.max(np.where(data.failed, data.high, data.low)))
        self.entry, self.low = data.entry / self.unit, data.low / self.unit
        self.high = np.column_stack([data.high[between], data.low[between]]).T / self.unit
        self._exact = int(data.exact.sum())
        self.exact_logs = float(np.log(self.low[data.exact]).sum())
        self.count = data.failures

    def parts(self, shape: float) -> tuple[float, Array]:
        """Return the exposure and each interval's width, in powers of age."""
        exposure = float((self.low**shape - self.entry**shape).sum())
        return exposure, self.high[0] ** shape - self.high[1] ** shape

    def at(self, shape: float, log_rate: float) -> float:
        """Return the log-likelihood at a shape and a log L in scaled ages, in the units of the records."""
        exposure, widths = self.parts(shape)
        rate = math.exp(min(log_rate, 700.0))
        value = self._exact * (math.log(shape) + log_rate - math.log(self.unit)) + (shape - 1.0) * self.exact_logs
        value -= rate * exposure
        if widths.size:
            value += float(np.log(-np.expm1(-np.maximum(rate * widths, 1e-300))).sum())
        return value

    def best_log_rate(self, shape: float) -> float:
        """Return the log L at which the likelihood of a shape is largest.

        Raises NoSolutionError when nothing was survived, so that every rate is too low.
        """
        exposure, widths = self.parts(shape)
        if exposure <= 1e-12 * float(widths.sum()):
            raise NoSolutionError("Weibull scale", "every failure lies within its first look")
        if not widths.size:
            return math.log(self._exact / exposure)

        def slope(log_rate: float) -> float:
            x = np.minimum(math.exp(log_rate) * widths, 700.0)
            return self._exact - math.exp(log_rate) * exposure + float((x / np.expm1(np.maximum(x, 1e-300))).sum())

        high = math.log(self.count / exposure)
        low = high - 1.0
        while slope(low) < 0.0:
            low -= 2.0
        return float(brentq(slope, low, high + 1e-9, xtol=1e-12))

    def profile(self, log_shape: float) -> float:
        shape = math.exp(log_shape)
        return self.at(shape, self.best_log_rate(shape))

    def scale_of(self, shape: float, log_rate: float) -> float:
        return self.unit * math.exp(-log_rate / shape)

    def along_scale(self, log_scale: float, around: float) -> float:
        """Return the largest log-likelihood at a scale, over shapes near a log shape."""
        offset = log_scale - math.log(self.unit)

        def cost(log_shape: float) -> float:
            shape = math.exp(log_shape)
            return -self.at(shape, -shape * offset)

        found = minimize_scalar(cost, bounds=_near(around, 1.5), method="bounded", options={"xatol": 1e-6})
        return -float(found.fun)


def _near(log_shape: float, reach: float) -> tuple[float, float]:
    return max(math.log(SHAPE_RANGE[0]), log_shape - reach), min(math.log(SHAPE_RANGE[1]), log_shape + reach)


def weibull(data: Lives, *, confidence: float = CONFIDENCE) -> Fit:
    """Return the Weibull of largest likelihood with likelihood-ratio intervals.

    Raises NoSolutionError where the records have no finite answer: fewer than two failures, all at one age, or all
    within their first look.
    """
    if data.failures < 2:
        raise NoSolutionError("Weibull shape", f"{data.failures} failures in the records, at least 2 are needed")
    like = _Likelihood(data)
    grid = np.linspace(math.log(SHAPE_RANGE[0]), math.log(SHAPE_RANGE[1]), 49)
    values = [like.profile(x) for x in grid]
    top = int(np.argmax(values))
    if top in (0, len(grid) - 1):
        raise NoSolutionError("Weibull shape", "the likelihood has no peak; do all failures stand at one age?")
    found = minimize_scalar(
        lambda x: -like.profile(x), bounds=(grid[top - 1], grid[top + 1]), method="bounded", options={"xatol": 1e-9}
    )
    log_shape, best = float(found.x), -float(found.fun)
    shape = math.exp(log_shape)
    scale = like.scale_of(shape, like.best_log_rate(shape))
    floor = best - float(chi2.ppf(confidence, 1)) / 2.0
    shape_low = _falls_to(lambda x: like.profile(x) - floor, log_shape, -0.25, math.log(SHAPE_RANGE[0]))
    shape_high = _falls_to(lambda x: like.profile(x) - floor, log_shape, 0.25, math.log(SHAPE_RANGE[1]))
    log_scale = math.log(scale)
    reach = math.log(1e4)
    scale_low = _falls_to(lambda x: like.along_scale(x, log_shape) - floor, log_scale, -0.25, log_scale - reach)
    scale_high = _falls_to(lambda x: like.along_scale(x, log_shape) - floor, log_scale, 0.25, log_scale + reach)
    return Fit(shape, scale, shape_low, shape_high, scale_low, scale_high, best, data.failures, data.censored, False)


def _falls_to(gap: Callable[[float], float], start: float, step: float, end: float) -> float | None:
    """Return exp(x) where ``gap`` falls through zero on the way from ``start`` towards ``end``; None if it does not."""
    inner, outer = start, start + step
    while (end - outer) * step > 0.0:
        if gap(outer) < 0.0:
            return math.exp(float(brentq(gap, inner, outer, xtol=1e-8)))
        inner, outer, step = outer, outer + 1.5 * step, 1.5 * step
    return math.exp(float(brentq(gap, inner, end, xtol=1e-8))) if gap(end) < 0.0 else None


def held_shape(data: Lives, *, shape: float, confidence: float = CONFIDENCE) -> Fit:
    """Return the scale at a shape that is not estimated; shape 1 is the exponential.

    The count of failures over an exposure in powers of age is Poisson, which gives the limits. Failures between two
    looks count at the middle of their interval for the limits. Without a failure only a lower limit of the scale is
    given (one-sided, at the same confidence). Raises NoSolutionError when nothing was at risk.
    """
    failures = data.failures
    middle = np.where(data.failed, (data.low + np.where(data.failed, data.high, 0.0)) / 2.0, data.low)
    exposure = float((middle**shape - data.entry**shape).sum())
    if exposure <= 0.0:
        raise NoSolutionError("hazard", "nothing was at risk in the records")
    tail = (1.0 - confidence) / 2.0

    def as_scale(rate: float) -> float:
        return float(rate ** (-1.0 / shape))

    if failures == 0:
        rate_high = -math.log(1.0 - confidence) / exposure
        return Fit(shape, None, None, None, as_scale(rate_high), None, 0.0, 0, data.censored, True)
    like = _Likelihood(data)
    log_rate = like.best_log_rate(shape)
    low = as_scale(float(chi2.ppf(1.0 - tail, 2 * failures + 2)) / 2.0 / exposure)
    high = as_scale(float(chi2.ppf(tail, 2 * failures)) / 2.0 / exposure)
    scale = like.scale_of(shape, log_rate)
    return Fit(shape, scale, None, None, low, high, like.at(shape, log_rate), failures, data.censored, True)


def constant_hazard_chance(data: Lives, fit: Fit) -> float:
    """Return the p-value of a constant hazard against the fitted Weibull (likelihood ratio, one degree of freedom)."""
    plain = held_shape(data, shape=1.0)
    return float(chi2.sf(max(0.0, 2.0 * (fit.log_likelihood - plain.log_likelihood)), 1))
