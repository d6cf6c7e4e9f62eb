"""Stock at bases and at the place that refills them: how many aircraft wait where, three ways of increasing
exactness.

Each removal at base j sends one engine to repair and asks the depot for one. X, the number in repair, is Poisson
with mean ``lambda T`` (Palm). With a depot stock of s0 the depot owes ``B0 = (X - s0)+``, and each engine owed
belongs to base j with chance ``f_j = lambda_j / lambda``. What base j still waits for is B_j plus what is on the
way, Poisson ``lambda_j t_j``.

* METRIC takes that as Poisson: mean ``lambda_j t_j + f_j E B0`` (Sherbrooke, *Operations Research* 16, 1968).
* two moments: negative binomial with the variance ``lambda_j t_j + f_j (1 - f_j) E B0 + f_j² Var B0`` (Graves,
  *Management Science* 31, 1985; the split is Simon's, *Operations Research* 19, 1971; from memory).
* exact: ``B_j`` given ``B0 = b`` is binomial (b, f_j), summed with the engines on the way (times on the way are
  fixed).
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Literal, NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.special import gammaln, xlog1py, xlogy

from planner.stock.best import Item, efficient
from planner.stock.cover import Away, Cover, chances, cover, cover_of_law, enough
from sim.errors import RequestError

Floats = NDArray[np.float64]
Method = Literal["metric", "two_moment", "exact"]


class Base(NamedTuple):
    """A base: removals a day, and days on the way from the depot to it."""

    name: str
    per_day: float
    way_days: float


class Places(NamedTuple):
    """Where a number of spares is held: at the depot, at each base, and what that does."""

    total: int
    depot: int
    at_base: tuple[int, ...]
    short_mean: float


def depot_owes(bases: Sequence[Base], *, repair_days: float, depot_stock: int) -> Floats:
    """Return the law of the number of engines that the depot owes, P(B0 = b), b = 0, 1, 2 …"""
    if depot_stock < 0 or repair_days < 0.0 or any(b.per_day < 0.0 or b.way_days < 0.0 for b in bases):
        raise RequestError(
            "stock at bases", f"depot stock {depot_stock}, repair {repair_days:g} days", "numbers from 0"
        )
    away = Away(sum(b.per_day for b in bases) * repair_days)
    law = chances(away, max(enough(away), depot_stock) + 12)
    return np.concatenate([[law[: depot_stock + 1].sum()], law[depot_stock + 1 :]])


def base_cover(
    bases: Sequence[Base], *, repair_days: float, depot_stock: int, most: int, method: Method = "exact"
) -> tuple[Cover, ...]:
    """Return cover and mean shortage of each base for its stocks 0 … ``most``, given the depot's stock."""
    owed = depot_owes(bases, repair_days=repair_days, depot_stock=depot_stock)
    number = np.arange(owed.size)
    mean = float(number @ owed)
    variance = float(number**2 @ owed) - mean * mean
    total = sum(b.per_day for b in bases)
    found = []
    for base in bases:
        share, way = (base.per_day / total if total else 0.0), base.per_day * base.way_days
        if method == "exact":
            found.append(_padded(cover_of_law(_waited_for(owed, share, way)), most))
            continue
        waited = way + share * mean
        spread = 1.0
        if method == "two_moment" and waited > 0.0:
            spread = (way + share * (1.0 - share) * mean + share * share * variance) / waited
        found.append(cover(Away(waited, spread), most))
    return tuple(found)


def _waited_for(owed: Floats, share: float, way: float) -> Floats:
    """Return the law of what one base waits for: its share of what is owed, and what is on the way."""
    b, x = np.arange(owed.size)[:, None], np.arange(owed.size)[None, :]
    inside = np.minimum(b, x)
    ways = gammaln(b + 1.0) - gammaln(inside + 1.0) - gammaln(b - inside + 1.0)
    split = np.where(x <= b, np.exp(ways + xlogy(inside, share) + xlog1py(b - inside, -share)), 0.0)
    moving = Away(way)
    return np.convolve(owed @ split, chances(moving, enough(moving)))


def _padded(found: Cover, most: int) -> Cover:
    """Return the cover of stocks 0 … ``most``: beyond the law's end everything is covered."""
    size = found.cover_frac.size
    if size > most:
        return Cover(found.cover_frac[: most + 1], found.short_mean[: most + 1])
    rest = most + 1 - size
    return Cover(np.concatenate([found.cover_frac, np.ones(rest)]), np.concatenate([found.short_mean, np.zeros(rest)]))


def best_places(
    bases: Sequence[Base], *, repair_days: float, total: int, method: Method = "exact"
) -> tuple[Places, ...]:
    """Return, for 0 … ``total`` spares in all, where to hold them so that the fewest aircraft wait on average.

    Exact: every depot stock is tried, and for each the bases' losses add up, so the best split is among the efficient
    choices of equal price. The first of equals holds more at the depot, from where an engine can go anywhere.
    """
    if total < 0:
        raise RequestError("spares", str(total), "0 or more")
    best: list[Places | None] = [None] * (total + 1)
    for depot in range(total, -1, -1):
        found = base_cover(bases, repair_days=repair_days, depot_stock=depot, most=total - depot, method=method)
        items = [Item(name=b.name, price=1.0, loss=c.short_mean) for b, c in zip(bases, found, strict=True)]
        choices = efficient(items, budget=float(total - depot))
        for held in range(depot, total + 1):
            number = choices.under(float(held - depot))
            loss = float(choices.loss[number])
            now = best[held]
            if now is None or loss < now.short_mean - 1e-12:
                spent = int(choices.cost[number])
                at_base = tuple(int(n) for n in choices.stocks[number])
                # what saves nothing at a base stays at the depot
                best[held] = Places(held, depot + (held - depot - spent), at_base, loss)
    return tuple(place for place in best if place is not None)
