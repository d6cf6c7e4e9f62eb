"""When enough runs have been made: looks at 16, 32, 64 … runs, each with a share of the error that is allowed.

Strategies are compared run by run under the same luck, so what counts is the difference within each run. Looking at the
data several times and stopping when they please would miss the promised coverage; each look is therefore made at level
1 - 0.05/looks, and by Bonferroni's inequality the intervals of all looks hold together with at least 95 %, whatever the
reason for stopping at one of them (Miller, *Simultaneous Statistical Inference*, 1981; from memory). Each interval is
Student's on the paired differences.

A study stops when the half-width of every difference is below the asked share of *total cost*, or every difference has
a clear sign, or the most runs allowed are done.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from itertools import combinations
from typing import Literal, NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray
from scipy.special import ndtri, stdtrit

from sim.errors import RequestError

LEAST_RUNS = 16
MOST_RUNS = 1024
ALLOWED_ERROR = 0.05
LEAST_FOR_PERCENTILES = 40

Reason = Literal["precise", "sign", "most", "more", "fixed", "cancelled"]


class Interval(NamedTuple):
    """The mean of paired differences with its interval at ``level_frac``; sd is that of one difference."""

    runs: int
    mean: float
    sd: float
    low: float
    high: float
    half_width: float
    level_frac: float


class Verdict(NamedTuple):
    """Whether to stop, why, and the interval of each pair (a, b) for a minus b."""

    stop: bool
    reason: Reason
    pairs: dict[tuple[str, str], Interval]


class Percentiles(NamedTuple):
    """None where there are too few values to name a percentile."""

    p10: float | None
    p50: float | None
    p90: float | None


def looks(*, least: int = LEAST_RUNS, most: int = MOST_RUNS) -> tuple[int, ...]:
    """Return the numbers of runs at which the rule looks: doubling from ``least``, the last one ``most``."""
    if most < 2:
        raise RequestError("most runs", str(most), "2 or more, since a difference needs a spread")
    planned = [least]
    while planned[-1] * 2 < most:
        planned.append(planned[-1] * 2)
    return (*(runs for runs in planned if runs < most), most)


def paired_interval(a: ArrayLike, b: ArrayLike, *, level_frac: float = 1.0 - ALLOWED_ERROR) -> Interval:
    """Return the interval for the mean of a minus b, run by run; without bounds (NaN) below two runs."""
    differences = np.asarray(a, dtype=float) - np.asarray(b, dtype=float)
    runs = differences.size
    mean = float(differences.mean()) if runs else math.nan
    if runs < 2:
        return Interval(runs, mean, math.nan, math.nan, math.nan, math.nan, level_frac)
    sd = float(differences.std(ddof=1))
    half = float(stdtrit(runs - 1, 0.5 + level_frac / 2.0)) * sd / math.sqrt(runs)
    return Interval(runs, mean, sd, mean - half, mean + half, half, level_frac)


def judge(
    totals: Mapping[str, NDArray[np.float64]],
    *,
    precision_frac: float,
    planned: tuple[int, ...],
) -> Verdict:
    """Judge the totals (each strategy's total cost in run order, all of the same length, a planned look).

    ``precision_frac`` is the half-width wanted as a share of the mean total cost over strategies and runs.
    """
    runs = len(next(iter(totals.values())))
    level = 1.0 - ALLOWED_ERROR / len(planned)
    pairs = _pairs(totals, level)
    wanted = precision_frac * abs(float(np.mean([np.mean(total) for total in totals.values()])))
    # One strategy alone has no difference: its own total is what must be known well.
    known = list(pairs.values()) or [paired_interval(total, 0.0, level_frac=level) for total in totals.values()]
    if all(interval.half_width <= wanted for interval in known):
        return Verdict(True, "precise", pairs)
    if pairs and all(pair.low > 0.0 or pair.high < 0.0 for pair in pairs.values()):
        return Verdict(True, "sign", pairs)
    if runs >= planned[-1]:
        return Verdict(True, "most", pairs)
    return Verdict(False, "more", pairs)


def expected_runs(
    totals: Mapping[str, NDArray[np.float64]],
    *,
    precision_frac: float,
    planned: tuple[int, ...],
) -> int:
    """Return the planned look at which the rule is likely to stop, as the spread so far has it.

    A half-width falls with the root of the runs; a pair is settled once it is precise enough or excludes zero.
    """
    verdict = judge(totals, precision_frac=precision_frac, planned=planned)
    runs = len(next(iter(totals.values())))
    if verdict.stop:
        return runs
    level = 1.0 - ALLOWED_ERROR / len(planned)
    known = list(verdict.pairs.values()) or [paired_interval(x, 0.0, level_frac=level) for x in totals.values()]
    wanted = precision_frac * abs(float(np.mean([np.mean(total) for total in totals.values()])))
    widths = []
    for interval in known:
        target = max(wanted, abs(interval.mean)) if verdict.pairs else wanted
        widths.append(interval.half_width / target if target else math.inf)
    needed = runs * max(widths) ** 2
    return next((look for look in planned if look >= needed), planned[-1])


def plain_verdict(totals: Mapping[str, NDArray[np.float64]], *, reason: Literal["fixed", "cancelled"]) -> Verdict:
    """Return the plain 95 % intervals of a study whose number of runs did not depend on its results."""
    return Verdict(True, reason, _pairs(totals, 1.0 - ALLOWED_ERROR))


def _pairs(totals: Mapping[str, NDArray[np.float64]], level_frac: float) -> dict[tuple[str, str], Interval]:
    return {(a, b): paired_interval(totals[a], totals[b], level_frac=level_frac) for a, b in combinations(totals, 2)}


def cheaper_chance(a: ArrayLike, b: ArrayLike) -> float:
    """Return the share of runs in which a costs less than b; a tie counts half."""
    differences = np.asarray(a, dtype=float) - np.asarray(b, dtype=float)
    return float(np.mean(np.where(differences == 0.0, 0.5, differences < 0.0)))


def luck_saved(a: ArrayLike, b: ArrayLike) -> float:
    """Return how many times more runs the same precision would have cost without common luck.

    It is the variance of the difference if the two were independent over that of the paired difference; below one when
    common luck did harm, infinite when the pairs differ by a constant.
    """
    first, second = np.asarray(a, dtype=float), np.asarray(b, dtype=float)
    apart = float(first.var(ddof=1) + second.var(ddof=1))
    paired = float((first - second).var(ddof=1))
    return math.inf if paired == 0.0 else apart / paired


def percentiles(values: ArrayLike) -> Percentiles:
    """Return P10, P50 and P90, or None each below 40 values: fewer leave four or less beyond the outer ones."""
    array = np.asarray(values, dtype=float)
    if array.size < LEAST_FOR_PERCENTILES:
        return Percentiles(None, None, None)
    return Percentiles(*(float(x) for x in np.quantile(array, (0.1, 0.5, 0.9))))


def runs_for_half_width(sd: float, half_width: float, *, level_frac: float = 1.0 - ALLOWED_ERROR) -> int:
    """Return the runs that a normal approximation asks for: (z sd / half-width)², rounded up."""
    return math.ceil((float(ndtri(0.5 + level_frac / 2.0)) * sd / half_width) ** 2)
