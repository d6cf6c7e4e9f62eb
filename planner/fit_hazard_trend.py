"""Does a repaired fleet fail more and more, or less and less often? The power-law process.

Failures at times t of one system that is repaired and goes on follow a Poisson process of mean ``scale * t^shape``:
shape above one means more and more often. Observed to a fixed time T with n failures, ``S = sum of log(T / t)``:
largest likelihood n / S, without bias (n - 1) / S; ``2 shape S`` is chi-squared with 2 n degrees of freedom, which
gives the test of no trend and the limits of the shape (MIL-HDBK-189, 1981, app. C; NIST/SEMATECH e-Handbook 8.4.5.2).

The mean time between failures at T, ``T / (shape * mean count)``, has exact limits from the law of n given S, which
depends on that product alone: ``P(n | S) ~ (x S)^n / (n! (n - 1)!)``, x = shape * mean count (Crow, *Technometrics* 24,
1982). Above a few hundred failures the e-Handbook's large-sample limits stand in for them.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import brentq
from scipy.special import gammaln
from scipy.stats import chi2, norm

from sim.errors import NoSolutionError, RequestError

LEAST_FAILURES = 3
# Up to here the exact sum is short; beyond, both limits agree within 1 % (tested).
MOST_EXACT = 400


class Trend(NamedTuple):
    """A fitted power-law process. ``shape`` is the estimate without bias, ``scale`` its fellow (failures a time^shape),
    ``no_trend_chance`` the two-sided p-value of a constant rate."""

    failures: int
    shape: float
    shape_likeliest: float
    shape_low: float
    shape_high: float
    scale: float
    mean_between: float
    mean_between_low: float
    mean_between_high: float
    no_trend_chance: float


def power_law(times: Sequence[float] | NDArray[np.float64], *, end: float, confidence: float = 0.95) -> Trend:
    """Return the power-law process of failures at ``times`` from the start at 0, watched until ``end``.

    Raises RequestError for times that are not in (0, end], NoSolutionError for fewer than three failures.
    """
    at = np.sort(np.asarray(times, dtype=float))
    if at.size and not (at[0] > 0.0 and at[-1] <= end and math.isfinite(end)):
        outside = at[0] if not at[0] > 0.0 else at[-1]
        raise RequestError("time of a failure", f"{outside:g}", f"above 0 and at most {end:g}")
    n = len(at)
    if n < LEAST_FAILURES:
        raise NoSolutionError("trend of failures", f"{n} in the records, at least {LEAST_FAILURES} are needed")
    logs = float(np.log(end / at).sum())
    if logs <= 0.0:
        raise NoSolutionError("trend of failures", "all stand at the very end of the time watched")
    shape = (n - 1) / logs
    tail = (1.0 - confidence) / 2.0
    low, high = (float(chi2.ppf(q, 2 * n)) / (2.0 * logs) for q in (tail, 1.0 - tail))
    below = float(chi2.cdf(2.0 * logs, 2 * n))
    mean_between = end / (n * shape)
    if n <= MOST_EXACT:
        product_low, product_high = _product_limits(n, logs, tail=tail)
        between_low, between_high = end / product_high, end / product_low
    else:
        between_low, between_high = large_sample_limits(n, mean_between, confidence=confidence)
    return Trend(
        failures=n,
        shape=shape,
        shape_likeliest=n / logs,
        shape_low=low,
        shape_high=high,
        scale=n / end**shape,
        mean_between=mean_between,
        mean_between_low=between_low,
        mean_between_high=between_high,
        no_trend_chance=min(1.0, 2.0 * min(below, 1.0 - below)),
    )


def large_sample_limits(failures: int, mean_between: float, *, confidence: float = 0.95) -> tuple[float, float]:
    """Return limits of the mean time between failures at the end, from its estimate without bias.

    NIST/SEMATECH e-Handbook 8.4.5.2, for a fixed time; good for many failures.
    """
    r, z = failures, float(norm.ppf(0.5 + confidence / 2.0))
    low = (r + z * z / 4.0 + math.sqrt(r * z * z / 2.0 + z**4 / 16.0)) ** 2
    high = (r - z * math.sqrt(r / 2.0)) ** 2
    return mean_between * r * (r - 1) / low, mean_between * r * (r - 1) / high


def _product_limits(n: int, logs: float, *, tail: float) -> tuple[float, float]:
    """Return the limits of shape times mean count, from the law of the count given the sum of logs."""

    def at_least(x: float) -> float:
        return _tail_of_count(n, x * logs)

    def at_most(x: float) -> float:
        return 1.0 - _tail_of_count(n + 1, x * logs)

    guess = n * n / logs
    low = brentq(lambda x: at_least(x) - tail, 1e-9 * guess, 10.0 * guess)
    high = brentq(lambda x: at_most(x) - tail, 1e-9 * guess, 100.0 * guess)
    return float(low), float(high)


def _tail_of_count(least: int, y: float) -> float:
    """Return P(count >= least) under ``y^n / (n! (n - 1)!)``, n from 1."""
    counts = np.arange(1, max(60, int(4.0 * math.sqrt(y)) + 60, 2 * least))
    logs = counts * math.log(y) - gammaln(counts + 1.0) - gammaln(counts)
    weights = np.exp(logs - logs.max())
    return float(weights[counts >= least].sum() / weights.sum())
