"""The best holding: for a target cover, under a budget, of least cost; and the efficient curve that is drawn."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from planner.holdings_model import Change, Model
from planner.stock.cover import check_target
from planner.stock.indentures import Holding, cheapest_for, efficient_holdings, holding
from sim.errors import RequestError
from sim.fleet import Fleet
from sim.fleet import Holding as StockRow

FULL_FRAC = 0.999  # the curve is drawn up to this cover
_CURVE_STEP_FRAC = 0.01  # choices that cover less than this more are left out of the drawn curve
_MOST_TIMES = 3.0  # budget looked at: so many times the price of engines for every pipeline


@dataclass(frozen=True, slots=True, kw_only=True)
class HoldingsRequest:
    """What is asked.

    ``engine_type`` empty: all types. ``strategy`` empty: the fleet's first. ``budget_usd``: price of all spares
    at most; ``target_frac``: cover at least (None: the fleet's wanted cover). ``keep``: nothing that is held is
    sold. ``stock``: a holding to look at. ``turn``, ``removals``, ``slots``: factors on the plan.
    """

    engine_type: str = ""
    strategy: str = ""
    budget_usd: float | None = None
    target_frac: float | None = None
    keep: bool = True
    stock: tuple[StockRow, ...] = ()
    turn: float = 1.0
    removals: float = 1.0
    slots: float = 1.0

    def __post_init__(self) -> None:
        if self.target_frac is not None:
            check_target(self.target_frac)
        for name, value in (("turn-time factor", self.turn), ("removals factor", self.removals), ("slots", self.slots)):
            if not 0.05 <= value <= 20.0:
                raise RequestError(name, f"{value:g}", "0.05 to 20")
        if self.budget_usd is not None and self.budget_usd < 0.0:
            raise RequestError("--budget", f"{self.budget_usd:,.0f} USD", "0 or more")

    @property
    def change(self) -> Change:
        return Change(turn=self.turn, removals=self.removals, slots=self.slots)


def target_of(fleet: Fleet, request: HoldingsRequest, one: Model) -> float:
    """Return the cover asked for: the request's, else that of the engine type, else the fleet's setting."""
    if request.target_frac is not None:
        return request.target_frac
    row = next(t for t in fleet.engine_types if t.engine_type == one.kind.engine_type)
    return fleet.settings.cover_wanted_frac if row.cover_wanted_frac is None else row.cover_wanted_frac


def today_of(one: Model) -> Holding:
    """Return what is held now: engines off the wing, and modules that fit at least half of the engines."""
    return holding(one.engine, one.modules, engines=one.engine.held, stocks=tuple(m.held for m in one.modules))


def reach_usd(one: Model) -> float:
    """Return a budget beyond which more stock covers nothing more."""
    engines = float(one.engine.means.max(initial=1.0)) + sum(float(m.added(0)[0]) for m in one.modules) + 4.0
    return _MOST_TIMES * engines * one.engine.price_usd + sum(m.price_usd * 8.0 for m in one.modules)


def drawn_curve(one: Model) -> tuple[Holding, ...]:
    """Return the efficient curve up to nearly full cover, choices that cover hardly more left out."""
    whole = efficient_holdings(one.engine, one.modules, budget_usd=_curve_usd(one))
    kept: list[Holding] = []
    for choice in whole:
        if not kept or choice.cover_frac >= kept[-1].cover_frac + _CURVE_STEP_FRAC:
            kept.append(choice)
    return tuple(kept)


def _curve_usd(one: Model) -> float:
    """Return the price of engines alone that cover nearly everything: no holding of that cover need cost more."""
    added = np.array([sum(float(m.added(0)[0]) for m in one.modules)])
    most = int(reach_usd(one) / one.engine.price_usd)
    below = one.engine.cover(added, most).cover_frac[0]
    enough = int(np.searchsorted(below, FULL_FRAC))
    return max(min(enough, most), one.engine.held, 1) * one.engine.price_usd


def best_holdings(fleet: Fleet, request: HoldingsRequest, models: Sequence[Model]) -> list[tuple[Holding, str]]:
    """Return the best holding of each type and why it is the best.

    Raises RequestError for a budget below what is held, NoSolutionError for a target out of reach.
    """
    if request.budget_usd is not None:
        return _under_budget(request, models, request.budget_usd)
    found = []
    for one in models:
        target = target_of(fleet, request, one)
        curve = efficient_holdings(one.engine, one.modules, budget_usd=reach_usd(one), keep=request.keep)
        found.append((cheapest_for(curve, target), f"the cheapest with a cover of at least {target:.1%}"))
    return found


def _under_budget(request: HoldingsRequest, models: Sequence[Model], budget: float) -> list[tuple[Holding, str]]:
    """Return the best holding of each type under one budget: the most cover for one type; for several the fewest
    engines short, each weighed by what a day out of service costs. Exact: all pairs of efficient choices are
    compared."""
    if len(models) == 1:
        curve = efficient_holdings(models[0].engine, models[0].modules, budget_usd=budget, keep=request.keep)
        return [(curve[-1], f"the most cover for {budget:,.0f} USD")]
    held = sum(today_of(one).price_usd for one in models) if request.keep else 0.0
    if budget < held - 1e-6:
        raise RequestError(
            "--budget",
            f"{budget:,.0f} USD",
            f"at least {held:,.0f} USD, the price of what is held",
            "raise it, or allow to sell (--sell)",
        )
    cost, loss = np.zeros(1), np.zeros(1)
    picks: list[tuple[Holding, ...]] = [()]
    for one in models:
        spare = budget - held + (today_of(one).price_usd if request.keep else 0.0)
        curve = efficient_holdings(one.engine, one.modules, budget_usd=spare, keep=request.keep, by="short")
        usd = one.kind.down_usd_per_day
        costs = (cost[:, None] + np.array([c.price_usd for c in curve])).ravel()
        losses = (loss[:, None] + np.array([c.short_mean for c in curve]) * usd).ravel()
        order = np.lexsort((losses, costs))
        order = order[costs[order] <= budget + 1e-6]
        best_before = np.concatenate([[np.inf], np.minimum.accumulate(losses[order])[:-1]])
        order = order[losses[order] < best_before - 1e-12]
        picks = [(*picks[i // len(curve)], curve[i % len(curve)]) for i in order.tolist()]
        cost, loss = costs[order], losses[order]
    why = f"the fewest engines short for {budget:,.0f} USD over all types, weighed by a day out of service"
    return [(choice, why) for choice in picks[-1]]
