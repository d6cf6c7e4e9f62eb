"""How many of an item are away at once, and how well a stock covers that.

Palm's theorem (1938): when demands are Poisson and each is away for a time of any law, the number away is Poisson
with mean ``mu`` = demands a day × days away. With a stock of s the chance that nobody waits is ``P(X <= s)``, and
``E (X - s)+ = sum_{x > s} (x - s) p(x)`` are short on average (Feeney and Sherbrooke, *Management Science* 12,
1966).

Demands that are planned vary less than Poisson, campaigns make them vary more. The variance over the mean, here
``spread``, then picks the law: one is Poisson, above one negative binomial (Sherbrooke, *Optimal Inventory
Modeling of Systems*, 2004), below one a mixture of two binomials of neighbouring size, which meets both moments
exactly and always exists when any law on whole numbers does (Adan, van Eenige and Resing, *Prob. in the Eng. and
Inf. Sciences* 9, 1995; from memory, proven here by its moments).
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.special import gammaln

from sim.errors import RequestError

_EQUAL = 1e-9  # a spread this near one is Poisson
_TAIL = 1e-10  # stocks are looked at until less than this is left uncovered
_MOST_BY_RECURRENCE = 300.0  # exp(-mean) keeps all its digits up to here and far beyond

Floats = NDArray[np.float64]


class Away(NamedTuple):
    """The number of an item away: its mean, and its variance over its mean."""

    mean: float
    spread: float = 1.0


class Cover(NamedTuple):
    """What stocks 0, 1, 2 … of an item do: chance that nobody waits, and how many are short on average."""

    cover_frac: Floats
    short_mean: Floats


def chances(away: Away, most: int) -> Floats:
    """Return P(X = x) for x = 0 … ``most``, shape (most + 1,).

    Raises RequestError for a mean below zero or a spread that no law on whole numbers has.
    """
    mean, spread = away
    if not (0.0 <= mean < math.inf) or not (0.0 <= spread < math.inf):
        raise RequestError("pipeline", f"mean {mean:g}, variance over mean {spread:g}", "numbers from 0")
    x = np.arange(most + 1)
    if mean == 0.0:
        return np.where(x == 0, 1.0, 0.0)
    if abs(spread - 1.0) < _EQUAL:
        return np.asarray(np.exp(x * math.log(mean) - mean - gammaln(x + 1.0)))
    if spread > 1.0:
        size, p = mean / (spread - 1.0), 1.0 / spread
        log_p = gammaln(x + size) - gammaln(size) - gammaln(x + 1.0) + size * math.log(p) + x * math.log1p(-p)
        return np.asarray(np.exp(log_p))
    return _two_binomials(mean, spread, x)


def least_spread(mean: float) -> float:
    """Return the least variance over mean that a law on whole numbers can have: f (1 - f) / mean, f the fraction."""
    part = mean - math.floor(mean)
    return part * (1.0 - part) / mean if mean > 0.0 else 0.0


def _two_binomials(mean: float, spread: float, x: NDArray[np.int64]) -> Floats:
    """Return a mixture of Bin(k, p) with chance q and Bin(k + 1, p) else, with the mean and spread asked for."""
    k, q, p = _mixture(np.array([mean]), spread)
    return np.asarray((q * _binomials(k, p, x.size - 1) + (1.0 - q) * _binomials(k + 1.0, p, x.size - 1))[:, 0])


def _mixture(mean: Floats, spread: float) -> tuple[Floats, Floats, Floats]:
    """Return k, q and p of the mixture of two binomials for each mean above zero."""
    part = mean - np.floor(mean)
    a = (np.maximum(spread, part * (1.0 - part) / mean) - 1.0) / mean  # E X (X - 1) / mean² - 1, in -1 … 0
    k = np.floor(-1.0 / a + _EQUAL)
    # with k trials or one more: mean = (k + 1 - q) p, and E X (X - 1) = mean² (1 + a)
    inside = np.maximum(0.0, -a * k * (1.0 + k) - k)
    room = np.where(a > -1.0 + _EQUAL, 1.0 + a, 1.0)
    q = np.where(a > -1.0 + _EQUAL, np.clip((1.0 + a * (1.0 + k) + np.sqrt(inside)) / room, 0.0, 1.0), 1.0)
    return k, q, np.minimum(1.0, mean / (k + 1.0 - q))


def _binomials(n: Floats, p: Floats, most: int) -> Floats:
    """Return P(X = x) of binomial laws for x = 0 … ``most``, shape (most + 1, laws).

    By the recurrence ``p(x + 1) = p(x) (n - x) / (x + 1) p / (1 - p)``, counted from the end where p is above a half.
    """
    flip = p > 0.5
    q = np.where(flip, 1.0 - p, p)
    odds = q / (1.0 - q)
    top = int(max(most, n.max(initial=0.0)))
    law = np.zeros((top + 1, n.size))
    law[0] = np.exp(n * np.log1p(-q))
    for x in range(top):
        law[x + 1] = law[x] * np.maximum(0.0, n - x) / (x + 1.0) * odds
    wanted = np.arange(most + 1)[:, None]
    at = np.where(flip, n - wanted, wanted).astype(np.int64)
    return np.where(at >= 0, np.take_along_axis(law, np.maximum(at, 0), axis=0), 0.0)


def cover(away: Away, most: int) -> Cover:
    """Return cover and mean shortage of stocks 0 … ``most``, each of shape (most + 1,).

    Cover rises and shortage falls with stock, convexly: one more spare saves ``1 - cover`` of a shortage.
    """
    below = np.minimum(1.0, np.cumsum(chances(away, most)))
    # E (X - s - 1)+ = E (X - s)+ - P(X > s), from E X at s = 0
    short = away.mean - np.concatenate([[0.0], np.cumsum(1.0 - below[:-1])])
    return Cover(below, np.maximum(short, 0.0))


def covers(means: Floats, most: int, *, spread: float = 1.0) -> Cover:
    """Return cover and mean shortage for many means at once, each of shape (*means.shape, most + 1)."""
    flat = np.asarray(means, dtype=np.float64).ravel()
    if flat.max(initial=0.0) > _MOST_BY_RECURRENCE:
        law = np.array([chances(Away(float(mean), spread), most) for mean in flat]).T
    elif spread < 1.0 - _EQUAL:
        k, q, p = _mixture(np.maximum(flat, _EQUAL), spread)
        law = q * _binomials(k, p, most) + (1.0 - q) * _binomials(k + 1.0, p, most)
        law[:, flat == 0.0] = np.eye(most + 1, 1)
    else:
        law = _by_recurrence(flat, most, spread)
    below = np.minimum(1.0, np.cumsum(law, axis=0)).T
    missing = np.cumsum(1.0 - below[:, :-1], axis=1)
    short = np.maximum(0.0, flat[:, None] - np.concatenate([np.zeros((flat.size, 1)), missing], axis=1))
    shape = (*np.shape(means), most + 1)
    return Cover(below.reshape(shape), short.reshape(shape))


def _by_recurrence(mean: Floats, most: int, spread: float) -> Floats:
    """Return P(X = x) of Poisson or negative binomial laws for x = 0 … ``most``, shape (most + 1, laws).

    By Panjer's recurrence ``p(x + 1) = p(x) (a + b / (x + 1))``, faster than gamma functions.
    """
    law = np.empty((most + 1, mean.size))
    if abs(spread - 1.0) < _EQUAL:
        law[0], a, b = np.exp(-mean), 0.0, mean
    else:
        size = mean / (spread - 1.0)
        law[0], a, b = spread**-size, 1.0 - 1.0 / spread, (size - 1.0) * (1.0 - 1.0 / spread)
    for x in range(most):
        law[x + 1] = law[x] * (a + b / (x + 1.0))
    return law


def cover_of_law(chance: Floats) -> Cover:
    """Return cover and mean shortage of stocks 0 … n from the whole law P(X = x), x = 0 … n, of the number away."""
    below = np.minimum(1.0, np.cumsum(chance))
    mean = float(np.arange(chance.size) @ chance)
    short = mean - np.concatenate([[0.0], np.cumsum(1.0 - below[:-1])])
    return Cover(below, np.maximum(short, 0.0))


def stock_for(away: Away, target_frac: float) -> int:
    """Return the least stock that covers ``target_frac`` of the time; raises RequestError outside 0 ≤ target < 1."""
    check_target(target_frac)
    most = enough(away)
    below = cover(away, most).cover_frac
    return int(np.searchsorted(below, target_frac - 1e-12))


def check_target(target_frac: float) -> None:
    """Raise RequestError unless a cover can be promised: no stock covers a demand without bound for certain."""
    if not 0.0 <= target_frac < 1.0:
        raise RequestError(
            "target cover",
            f"{target_frac:.0%}",
            "from 0 % to below 100 %",
            "no stock covers a demand that has no bound for certain; ask for 99 %, for instance",
        )


def enough(away: Away) -> int:
    """Return the least stock that leaves less than 1e-10 uncovered: what is worth looking at, never a bound."""
    most = 16
    while True:
        beyond = 1.0 - np.cumsum(chances(away, most))
        if beyond[-1] < _TAIL:
            return max(1, int(np.argmax(beyond < _TAIL)))
        most *= 2


def sum_of_chances(chance: Floats) -> Floats:
    """Return the law of how many of n independent things happen, each with its own chance (Poisson-binomial).

    ``chance`` has shape (n,), the law (n + 1,). Its spread is ``1 - sum p² / sum p``: never above Poisson's.
    Exact, by adding one thing after the other.
    """
    law = np.zeros(chance.size + 1)
    law[0] = 1.0
    for i, p in enumerate(chance.tolist()):
        law[1 : i + 2] = law[1 : i + 2] * (1.0 - p) + law[: i + 1] * p
        law[0] *= 1.0 - p
    return law
