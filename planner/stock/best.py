"""Best stocks for the money, exactly: every efficient choice, the best under a budget, the cheapest for a target.

Each item has a loss that falls with its stock (engines short on average, or minus the log of a cover) and a
price; losses and prices add up. Greedy (most loss saved for the money, item by item) finds the corners of the
convex hull of the efficient choices and nothing between them. Here all of them are found: items are added one by
one and of the sums so far only those are kept that no other beats in both cost and loss (Nemhauser and Ullmann,
*Management Science* 15, 1969). The best choice for any budget is made of such sums, whatever the shape of the
losses, so the result is proven by construction.

To keep the list short, a sum is dropped as well when even the convex lower bound of what the remaining items can
do would not bring it below what greedy reaches for the same money; that drops no efficient choice.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sim.errors import RequestError

Floats = NDArray[np.float64]
Counts = NDArray[np.int64]
_SAME_LOSS = 1e-12  # losses that differ by less are the same; far below what any figure shows
_PRUNE_FROM = 400  # sums: below this the bound costs more than it saves


@dataclass(frozen=True, slots=True, kw_only=True)
class Item:
    """One stocked item: its price (USD, or any unit), its loss at stock 0, 1, 2 …, and the least stock to hold."""

    name: str
    price: float
    loss: Floats
    least: int = 0


class Choices(NamedTuple):
    """Efficient choices, cheapest first: cost and loss, shape (n,), stocks of every item, shape (n, items)."""

    cost: Floats
    loss: Floats
    stocks: Counts

    def under(self, budget: float) -> int:
        """Return the number of the best choice that the budget pays; raises RequestError when it pays none."""
        if budget < self.cost[0] - _slack(budget):
            raise RequestError(
                "budget",
                f"{budget:,.0f}",
                f"at least {self.cost[0]:,.0f}",
                "that is the price of what is held already; raise the budget, or allow to sell",
            )
        return int(np.searchsorted(self.cost, budget + _slack(budget), side="right")) - 1

    def for_loss(self, most: float) -> int:
        """Return the number of the cheapest choice with a loss of at most ``most``; RequestError when there is
        none."""
        if self.loss[-1] > most + _SAME_LOSS:
            raise RequestError(
                "target",
                f"a loss of at most {most:.6g}",
                f"at least {self.loss[-1]:.6g}, the best within the stocks and budget looked at",
                "raise the budget or the most stock that may be held",
            )
        return int(np.searchsorted(-self.loss, -most - _SAME_LOSS))


def _slack(budget: float) -> float:
    """Return the rounding of a sum of prices, so that a budget equal to it pays for it."""
    return 1e-9 * max(1.0, abs(budget))


def efficient(items: Sequence[Item], *, budget: float) -> Choices:
    """Return every efficient choice that costs at most ``budget``: none is beaten in both cost and loss.

    Raises RequestError for a price that is not above zero, a loss that rises with stock, or a budget below what
    is held.
    """
    _check(items)
    held = sum(item.price * item.least for item in items)
    if budget < held - _slack(budget):
        raise RequestError(
            "budget",
            f"{budget:,.0f}",
            f"at least {held:,.0f}, the price of what is held",
            "raise the budget, or allow to sell",
        )
    cost, loss = np.array([held]), np.array([0.0])
    bound = _Bound(items, budget - held)
    trail: list[tuple[Counts, Counts]] = []
    for number, item in enumerate(items):
        cost, loss, parent, stock = _with_item(cost, loss, item, budget)
        if cost.size > _PRUNE_FROM:
            keep = bound.may_win(cost - held, loss, number + 1)
            cost, loss, parent, stock = cost[keep], loss[keep], parent[keep], stock[keep]
        trail.append((parent, stock))
    stocks = np.zeros((cost.size, len(items)), dtype=np.int64)
    at = np.arange(cost.size)
    for number in range(len(items) - 1, -1, -1):
        parent, stock = trail[number]
        stocks[:, number] = stock[at]
        at = parent[at]
    return Choices(cost, loss, stocks)


def _check(items: Sequence[Item]) -> None:
    for item in items:
        if not item.price > 0.0:
            raise RequestError(f"price of {item.name}", f"{item.price:g}", "more than 0")
        if not 0 <= item.least < item.loss.size:
            raise RequestError(f"stock of {item.name}", str(item.least), f"0 to {item.loss.size - 1}")
        if (np.diff(item.loss) > _SAME_LOSS).any():
            raise RequestError(f"loss of {item.name}", "a loss that rises with stock", "one that falls")


def _with_item(cost: Floats, loss: Floats, item: Item, budget: float) -> tuple[Floats, Floats, Counts, Counts]:
    """Return the undominated sums of what stands so far and each stock of one more item, with where they come
    from."""
    added = np.arange(item.least, item.loss.size)
    costs = (cost[None, :] + item.price * (added - item.least)[:, None]).ravel()
    losses = (loss[None, :] + item.loss[added][:, None]).ravel()
    affordable = np.flatnonzero(costs <= budget + _slack(budget))
    order = affordable[np.lexsort((losses[affordable], costs[affordable]))]
    costs, losses = costs[order], losses[order]
    best_before = np.concatenate([[np.inf], np.minimum.accumulate(losses)[:-1]])
    keep = losses < best_before - _SAME_LOSS
    order = order[keep]
    return costs[keep], losses[keep], order % cost.size, added[order // cost.size]


class _Bound:
    """What the items from a number on can save at most for an amount of money, and what greedy is sure to reach."""

    def __init__(self, items: Sequence[Item], money: float) -> None:
        steps = [_hull_steps(item) for item in items]
        self._rest = [_envelope(items[number:], steps[number:]) for number in range(len(items) + 1)]
        cost, loss = _greedy_walk(items, money)
        # greedy holds its loss from its cost up to its next cost; just below that next cost it is weakest
        self._next_cost = np.append(cost[1:], money)
        self._loss = loss

    def may_win(self, spent: Floats, loss: Floats, number: int) -> NDArray[np.bool_]:
        """Return which sums over the first ``number`` items may still lead to an efficient choice."""
        rest_cost, rest_loss = self._rest[number]
        left = self._next_cost[None, :] - spent[:, None]
        reach = loss[:, None] + np.interp(left, rest_cost, rest_loss)
        possible = (left >= -1e-9 * max(1.0, float(self._next_cost[-1]))) & (reach <= self._loss[None, :] + _SAME_LOSS)
        return np.asarray(possible.any(axis=1))


def _hull_steps(item: Item) -> list[tuple[float, float, float]]:
    """Return the edges of the lower convex hull of an item's loss over cost as (saved per money, cost, saved)."""
    points = [(item.price * n, float(item.loss[item.least + n])) for n in range(item.loss.size - item.least)]
    hull: list[tuple[float, float]] = []
    for point in points:
        while len(hull) > 1 and _is_above(hull[-2], hull[-1], point):
            hull.pop()
        hull.append(point)
    return [((a[1] - b[1]) / (b[0] - a[0]), b[0] - a[0], a[1] - b[1]) for a, b in pairwise(hull)]


def _is_above(a: tuple[float, float], b: tuple[float, float], c: tuple[float, float]) -> bool:
    """Return whether b lies on or above the line from a to c."""
    return (b[1] - a[1]) * (c[0] - a[0]) >= (c[1] - a[1]) * (b[0] - a[0])


def _envelope(items: Sequence[Item], steps: Sequence[list[tuple[float, float, float]]]) -> tuple[Floats, Floats]:
    """Return cost and least loss of some items if stocks could be split: a convex lower bound."""
    start = sum(float(item.loss[item.least]) for item in items)
    edges = sorted((edge for one in steps for edge in one), key=lambda edge: -edge[0])
    cost = np.concatenate([[0.0], np.cumsum([edge[1] for edge in edges])])
    loss = start - np.concatenate([[0.0], np.cumsum([edge[2] for edge in edges])])
    return cost, loss


def greedy(items: Sequence[Item], *, budget: float) -> Choices:
    """Return the walk of greedy from the least stocks on: each step the spare that saves most loss for its price.

    It stops at the first step that the budget does not pay, as in the textbooks; for comparison only.
    """
    _check(items)
    held = sum(item.price * item.least for item in items)
    cost, loss, stocks = [held], [sum(float(i.loss[i.least]) for i in items)], [[item.least for item in items]]
    while True:
        step = _best_step(items, stocks[-1])
        if step is None or cost[-1] + items[step].price > budget + _slack(budget):
            break
        item, now = items[step], list(stocks[-1])
        loss.append(loss[-1] - float(item.loss[now[step]] - item.loss[now[step] + 1]))
        now[step] += 1
        cost.append(cost[-1] + item.price)
        stocks.append(now)
    return Choices(np.array(cost), np.array(loss), np.array(stocks, dtype=np.int64))


def _greedy_walk(items: Sequence[Item], money: float) -> tuple[Floats, Floats]:
    """Return cost beyond what is held, and loss, of greedy that skips what the money does not pay."""
    stocks = [item.least for item in items]
    cost, loss = [0.0], [sum(float(i.loss[i.least]) for i in items)]
    barred: set[int] = set()
    while True:
        step = _best_step(items, stocks, barred)
        if step is None:
            break
        item = items[step]
        if cost[-1] + item.price > money:
            barred.add(step)
            continue
        loss.append(loss[-1] - float(item.loss[stocks[step]] - item.loss[stocks[step] + 1]))
        cost.append(cost[-1] + item.price)
        stocks[step] += 1
    return np.array(cost), np.array(loss)


def _best_step(
    items: Sequence[Item], stocks: Sequence[int], barred: set[int] | frozenset[int] = frozenset()
) -> int | None:
    """Return the item whose next spare saves most loss for its price; the first of equals, None when nothing
    saves."""
    best, best_rate = None, _SAME_LOSS
    for number, item in enumerate(items):
        now = stocks[number]
        if number in barred or now + 1 >= item.loss.size:
            continue
        rate = float(item.loss[now] - item.loss[now + 1]) / item.price
        if rate > best_rate:
            best, best_rate = number, rate
    return best
