"""Which of several simulated choices is cheapest, with a stated chance of being right, under common luck.

Every choice is simulated with the same run numbers; only differences within a run count, whatever their covariance.
``delta`` is the difference that does not matter to whoever asks.

* Two stages: after n0 runs each, ``n = max(n0, ceil(t² S² / delta²))`` with S² the largest variance of a
* Two stages: after n0 runs each, ``n = max(n0, ceil(t² S² / delta²))`` with S² the largest variance of a
  difference and ``t = t(1 - alpha / (k - 1), n0 - 1)``; the least mean of n runs is chosen. With at least 1 -
  alpha it is the best, or not more than delta worse (Clark and Yang, Winter Simulation Conference 1986; Nelson
  and Matejcik, *Management Science* 41, 1995, whose intervals against the best come with it).
* In sequence: a choice is dropped as soon as its lead over another is worse than ``W = max(0, (h² S² / delta -
* In sequence: a choice is dropped as soon as its lead over another is worse than ``W = max(0, (h² S² / delta -
  delta r) / 2r)``, S² from the first n0 runs, ``h² = (n0 - 1) ((2 alpha / (k - 1)) ** (-2 / (n0 - 1)) - 1)``.
  With at least 1 - alpha the best survives when it is better than every other by delta or more (Kim and Nelson,
  *ACM TOMACS* 11, 2001; from memory, its promise tested on a model with a known answer). It needs the fewest
  runs, so it is what ``select`` does.
* Sharing a budget of runs (OCBA): ``N_i / N_j = (s_i / d_i)² / (s_j / d_j)²``, ``N_best = s_best sqrt(sum N_i² /
  s_i²)``
  (Chen and Lee, *Stochastic Simulation Optimization*, 2011, ch. 3); no promise, shown for comparison.

All take normal means of runs; a run's total is a sum over hundreds of events.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.special import stdtrit

from sim.errors import RequestError

Floats = NDArray[np.float64]
Sample = Callable[[Sequence[str], int, int], dict[str, Floats]]

FIRST_RUNS = 16
MOST_RUNS = 512
BLOCK_RUNS = 8


@dataclass(frozen=True, slots=True, kw_only=True)
class Rule:
    """What is asked: a difference that does not matter, the promise, and how many runs at the least and most."""

    delta_usd: float
    level_frac: float = 0.95
    first_runs: int = FIRST_RUNS
    most_runs: int = MOST_RUNS
    block_runs: int = BLOCK_RUNS

    def __post_init__(self) -> None:
        if not self.delta_usd > 0.0:
            raise RequestError("difference that does not matter", f"{self.delta_usd:g} USD", "more than 0")
        if not 0.5 <= self.level_frac < 1.0:
            raise RequestError("promise", f"{self.level_frac:.0%}", "from 50 % to below 100 %")
        if not 2 <= self.first_runs <= self.most_runs:
            raise RequestError(
                "runs", f"{self.first_runs} first, {self.most_runs} at most", "2 or more first, no fewer at most"
            )


class Selected(NamedTuple):
    """The answer: the choice, whether the promise holds, who is left, and the runs behind every choice's mean.

    ``dropped``: choice and the run after which it was given up. ``totals``: totals in run order of each choice,
    as far as it was simulated. ``reason``: decided, most (runs used up with several left), or cancelled.
    """

    best: str
    reason: str
    left: tuple[str, ...]
    dropped: tuple[tuple[str, int], ...]
    totals: dict[str, Floats]

    @property
    def runs(self) -> int:
        return int(self.totals[self.best].size)


class AgainstBest(NamedTuple):
    """One choice against the best of the others: an interval for how much more it costs (Nelson and Matejcik)."""

    name: str
    low: float
    high: float


def second_stage_runs(totals: Sequence[Sequence[float]] | Floats, *, delta: float, level_frac: float = 0.95) -> int:
    """Return the runs that two-stage selection asks for; ``totals`` has shape (choices, first runs)."""
    first = np.asarray(totals, dtype=np.float64)
    choices, runs = first.shape
    if choices < 2:
        return int(runs)
    t = float(stdtrit(runs - 1, 1.0 - (1.0 - level_frac) / (choices - 1)))
    return max(int(runs), math.ceil(t * t * float(_difference_variances(first).max()) / (delta * delta)))


def _difference_variances(totals: Floats) -> Floats:
    """Return the sample variance of the difference of each pair, shape (choices, choices)."""
    covariance = np.atleast_2d(np.cov(totals, ddof=1))
    own = np.diag(covariance)
    return np.maximum(0.0, own[:, None] + own[None, :] - 2.0 * covariance)


def against_best(means: dict[str, float], *, delta: float) -> tuple[AgainstBest, ...]:
    """Return for each choice the interval of its mean less the least mean of the others, after two-stage selection.

    All hold together with the selection's promise; an interval that ends at 0 is a choice that is the best.
    """
    found = []
    for name, mean in means.items():
        gap = mean - min(other for key, other in means.items() if key != name)
        found.append(AgainstBest(name, min(0.0, gap - delta), max(0.0, gap + delta)))
    return tuple(found)


def survivors(totals: Sequence[Sequence[float]] | Floats, *, level_frac: float = 0.95) -> tuple[int, ...]:
    """Return the choices that may be the cheapest after equal runs: with the promise, the best is among them.

    A choice stays when its mean is at most every other's plus ``t S / sqrt(n)`` (Nelson, Swann, Goldsman and Song,
    *Operations Research* 49, 2001).
    """
    data = np.asarray(totals, dtype=np.float64)
    choices, runs = data.shape
    if choices < 2:
        return tuple(range(choices))
    t = float(stdtrit(runs - 1, 1.0 - (1.0 - level_frac) / (choices - 1)))
    allowed = t * np.sqrt(_difference_variances(data) / runs)
    mean = data.mean(axis=1)
    stays = (mean[:, None] <= mean[None, :] + allowed).all(axis=1)
    return tuple(int(i) for i in np.flatnonzero(stays))


def share_of_runs(means: Sequence[float], variances: Sequence[float], *, budget: int) -> tuple[int, ...]:
    """Return how a budget of runs is best shared when the least mean is sought (OCBA), rounded, summing to the
    budget."""
    mean, variance = np.asarray(means, dtype=np.float64), np.asarray(variances, dtype=np.float64)
    best = int(np.argmin(mean))
    gap = mean - mean[best]
    others = np.arange(mean.size) != best
    if (gap[others] <= 0.0).any():
        raise RequestError("means", "two equal least ones", "one least mean", "more first runs part them")
    ratio = np.zeros(mean.size)
    ratio[others] = variance[others] / gap[others] ** 2
    ratio[best] = math.sqrt(variance[best] * float((ratio[others] ** 2 / variance[others]).sum()))
    exact = budget * ratio / ratio.sum()
    whole = np.floor(exact)
    for i in np.argsort(whole - exact, kind="stable")[: budget - int(whole.sum())]:
        whole[i] += 1
    return tuple(int(n) for n in whole)


def select(
    names: Sequence[str], sample: Sample, *, rule: Rule, cancelled: Callable[[], bool] = lambda: False
) -> Selected:
    """Return the choice of least mean total, dropping choices run by run as soon as the promise allows.

    ``sample(names, start, stop)`` returns totals of runs start … stop - 1 for each name, as an array in run
    order; it may return fewer when cancelled. Ties go to the first name.
    """
    if not names:
        raise RequestError("choices", "none", "one or more")
    totals = dict(sample(names, 0, rule.first_runs))
    left, dropped = list(names), []
    whole = min(values.size for values in totals.values())
    if whole < rule.first_runs:
        return Selected(_least(left, totals), "cancelled", tuple(left), (), totals)
    first = np.array([totals[name] for name in names])
    variance = _difference_variances(first)
    reach = _reach(len(names), rule)
    runs = rule.first_runs
    checked = runs - 1
    while True:
        for r in range(checked + 1, runs + 1):
            for name in _losers(left, names, totals, variance, r, reach, rule.delta_usd):
                left.remove(name)
                dropped.append((name, r))
        checked = runs
        if len(left) == 1:
            return Selected(left[0], "decided", tuple(left), tuple(dropped), totals)
        if runs >= rule.most_runs or cancelled():
            reason = "most" if runs >= rule.most_runs else "cancelled"
            return Selected(_least(left, totals), reason, tuple(left), tuple(dropped), totals)
        stop = min(runs + rule.block_runs, rule.most_runs)
        more = sample(left, runs, stop)
        got = min(values.size for values in more.values())
        for name in left:
            totals[name] = np.concatenate([totals[name], more[name][:got]])
        if got < stop - runs:
            return Selected(_least(left, totals), "cancelled", tuple(left), tuple(dropped), totals)
        runs = stop


def _reach(choices: int, rule: Rule) -> float:
    """Return h² of the sequential rule."""
    free = rule.first_runs - 1
    if choices < 2:
        return 0.0
    share = 2.0 * (1.0 - rule.level_frac) / (choices - 1)
    return free * (math.pow(share, -2.0 / free) - 1.0)


def _losers(
    left: Sequence[str],
    names: Sequence[str],
    totals: dict[str, Floats],
    variance: Floats,
    runs: int,
    reach: float,
    delta: float,
) -> list[str]:
    """Return the choices of those left that another one beats by more than the rule allows after so many runs."""
    mean = {name: float(totals[name][:runs].mean()) for name in left}
    number = {name: i for i, name in enumerate(names)}
    found = []
    for name in left:
        spread = variance[number[name]]
        if any(
            mean[name] > mean[other] + max(0.0, (reach * spread[number[other]] / delta - delta * runs) / (2.0 * runs))
            for other in left
        ):
            found.append(name)
    return found


def _least(left: Sequence[str], totals: dict[str, Floats]) -> str:
    """Return the choice of least mean over the runs that all of those left have; the first of equals."""
    runs = min(totals[name].size for name in left)
    return min(left, key=lambda name: float(totals[name][:runs].mean()) if runs else 0.0)
