"""Engines and their modules together: a module on the shelf shortens the time for which an engine is away.

MOD-METRIC (Muckstadt, *Management Science* 20, 1973): an engine that waits for module m waits ``E B_m /
lambda_m`` days on average, so the modules add ``sum_m E B_m`` engines to those that are away, with ``E B_m`` the
mean shortage of module m. A fleet that does not wait but sends the engine away whole when the shelf is empty
loses sales instead: a share of demands given by Erlang's formula (which holds for any law of repair times) makes
the engine stay away longer.

Either way the modules' stocks count through one number, the engines that they add. It falls with each stock, and
cover falls with it; so the efficient choices of modules (planner/stock/best.py), each with every engine stock,
hold every efficient choice of both together. Nothing is left out.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Literal, NamedTuple

import numpy as np
from numpy.typing import NDArray

from planner.stock.best import Counts, Item, efficient
from planner.stock.cover import Away, Cover, check_target, cover, covers, enough
from sim.errors import NoSolutionError, RequestError
from sim.queues import erlang_loss

Floats = NDArray[np.float64]
_SAME_COVER = 1e-12  # covers that differ by less are the same


@dataclass(frozen=True, slots=True, kw_only=True)
class ModuleDemand:
    """A module asked from the shelf: demands a day, days until the one removed is back, its price and stock now.

    ``longer_days``: how much longer the engine is away when it is sent away whole because the shelf is empty;
    None when it waits for its module instead.
    """

    module: str
    per_day: float
    back_days: float
    price_usd: float
    longer_days: float | None = None
    held: int = 0

    def added(self, most: int) -> Floats:
        """Return the engines away more on average with 0 … ``most`` of this module on the shelf."""
        away = Away(self.per_day * self.back_days)
        if self.longer_days is None:
            return cover(away, most).short_mean
        lost = np.array([erlang_loss(n, away.mean) for n in range(most + 1)])
        return self.per_day * self.longer_days * lost

    def served_frac(self, stock: int) -> float:
        """Return the share of demands that find a module on the shelf."""
        away = Away(self.per_day * self.back_days)
        if self.longer_days is not None:
            return 1.0 - erlang_loss(stock, away.mean)
        return float(cover(away, stock).cover_frac[stock - 1]) if stock > 0 else 0.0

    @property
    def enough(self) -> int:
        return enough(Away(self.per_day * self.back_days))


@dataclass(frozen=True, slots=True, kw_only=True)
class EngineDemand:
    """Engines of a type away: a mean for each period (with the modules' shelves full), their spread, the price.

    ``weight``: what part of all exchanges falls in each period, against an even one; the modules' engines follow it.
    ``taken``: spares that fill positions for good, by period. ``share``: weight of each period in the averages.
    """

    engine_type: str
    means: Floats
    price_usd: float
    spread: float = 1.0
    weight: Floats | None = None
    taken: Counts | None = None
    share: Floats | None = None
    held: int = 0

    def cover(self, added: Floats, most: int) -> Cover:
        """Return cover and mean shortage of 0 … ``most`` engines over the periods, shape (added, most + 1)."""
        found = self.by_period(added, most)
        share = np.full(self.means.size, 1.0 / self.means.size) if self.share is None else self.share
        return Cover(np.tensordot(found.cover_frac, share, (1, 0)), np.tensordot(found.short_mean, share, (1, 0)))

    def by_period(self, added: Floats, most: int) -> Cover:
        """Return the same for each period, shape (added, periods, most + 1)."""
        weight = np.ones(self.means.size) if self.weight is None else self.weight
        means = self.means + added[:, None] * weight
        if self.taken is None or not self.taken.any():
            return covers(means, most, spread=self.spread)
        freed = max(0, -int(self.taken.min()))
        found = covers(means, most + freed, spread=self.spread)
        stock = np.arange(most + 1) - self.taken[:, None]  # what is left of 0 … most spares, shape (periods, most + 1)
        at = np.broadcast_to(np.maximum(stock, 0), (added.size, *stock.shape))
        below = np.take_along_axis(found.cover_frac, at, axis=2)
        short = np.take_along_axis(found.short_mean, at, axis=2)
        # spares that are owed leave positions open for good
        return Cover(np.where(stock < 0, 0.0, below), short + np.maximum(-stock, 0))


class Holding(NamedTuple):
    """One choice: engines, modules in the order of the demands, what they cost, and what they do."""

    engines: int
    modules: tuple[int, ...]
    price_usd: float
    cover_frac: float
    short_mean: float
    added_mean: float


def holding(engine: EngineDemand, modules: Sequence[ModuleDemand], *, engines: int, stocks: Sequence[int]) -> Holding:
    """Return what one choice of stocks does."""
    if engines < 0 or min(stocks, default=0) < 0:
        raise RequestError("stock", f"{engines} engines, modules {list(stocks)}", "numbers from 0")
    added = sum(float(m.added(n)[n]) for m, n in zip(modules, stocks, strict=True))
    found = engine.cover(np.array([added]), engines)
    price = engines * engine.price_usd + sum(m.price_usd * n for m, n in zip(modules, stocks, strict=True))
    return Holding(engines, tuple(stocks), price, float(found.cover_frac[0, -1]), float(found.short_mean[0, -1]), added)


def efficient_holdings(
    engine: EngineDemand,
    modules: Sequence[ModuleDemand],
    *,
    budget_usd: float,
    keep: bool = False,
    by: Literal["cover", "short"] = "cover",
) -> tuple[Holding, ...]:
    """Return every holding that costs at most the budget and that no cheaper one beats in cover (or in engines short,
    as ``by`` says), cheapest first.

    ``keep``: nothing that is held is given up. Raises RequestError for a budget below what is held then.
    """
    floor = engine.held if keep else 0
    items = [
        Item(name=m.module, price=m.price_usd, loss=m.added(max(m.enough, m.held)), least=m.held if keep else 0)
        for m in modules
    ]
    held_usd = floor * engine.price_usd + sum(item.price * item.least for item in items)
    if budget_usd < held_usd * (1.0 - 1e-12) or budget_usd < 0.0:
        raise RequestError(
            "budget",
            f"{budget_usd:,.0f} USD",
            f"at least {held_usd:,.0f} USD" + (", the price of what is held" if keep else ""),
            "raise the budget, or allow to sell" if keep else "",
        )
    choices = efficient(items, budget=budget_usd - floor * engine.price_usd)
    most = _most_engines(engine, float(choices.loss.max()), budget_usd, floor)
    return _undominated(
        engine, choices.cost, choices.loss, choices.stocks, floor=floor, most=most, budget_usd=budget_usd, by=by
    )


def _most_engines(engine: EngineDemand, added: float, budget_usd: float, floor: int) -> int:
    weight = 1.0 if engine.weight is None else float(engine.weight.max(initial=1.0))
    away = Away(float(engine.means.max(initial=0.0)) + added * weight, engine.spread)
    taken = 0 if engine.taken is None else max(0, int(engine.taken.max()))
    return max(floor, min(enough(away) + taken, int(budget_usd / engine.price_usd + 1e-9)))


def _undominated(
    engine: EngineDemand,
    costs: Floats,
    added: Floats,
    stocks: Counts,
    *,
    floor: int,
    most: int,
    budget_usd: float,
    by: str,
) -> tuple[Holding, ...]:
    """Return the holdings that no cheaper or equally dear one beats in what counts (of equals, the better in the
    other)."""
    found = engine.cover(added, most)
    number = np.arange(floor, most + 1)
    price = costs[:, None] + number * engine.price_usd
    below, short = found.cover_frac[:, floor:], found.short_mean[:, floor:]
    payable = np.flatnonzero(price.ravel() <= budget_usd * (1.0 + 1e-12))
    worse = (1.0 - below if by == "cover" else short).ravel()
    other = (short if by == "cover" else 1.0 - below).ravel()
    order = payable[np.lexsort((other[payable], worse[payable], price.ravel()[payable]))]
    best_before = np.concatenate([[np.inf], np.minimum.accumulate(worse[order])[:-1]])
    kept = order[worse[order] < best_before - _SAME_COVER]
    return tuple(
        Holding(
            int(number[one % number.size]),
            tuple(int(n) for n in stocks[one // number.size]),
            float(price.ravel()[one]),
            float(below.ravel()[one]),
            float(short.ravel()[one]),
            float(added[one // number.size]),
        )
        for one in kept
    )


def cheapest_for(curve: Sequence[Holding], target_frac: float) -> Holding:
    """Return the cheapest holding of an efficient curve with that cover.

    Raises RequestError for a target of 100 % or more, NoSolutionError when no holding on the curve reaches it.
    """
    check_target(target_frac)
    for one in curve:
        if one.cover_frac >= target_frac - 1e-12:
            return one
    best = f"{curve[-1].cover_frac:.1%} for {curve[-1].price_usd:,.0f} USD" if curve else "nothing"
    raise NoSolutionError(f"cover of {target_frac:.0%}", f"the best within the budget is {best}")
