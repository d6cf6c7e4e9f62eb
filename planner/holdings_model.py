"""From a fleet's demand to stocked items: pipelines of engines and modules of one type, ready for every stock.

Engines: for every quarter, later half-year, the mean number away with the modules' shelves full, and how far it
spreads (planned removals are surer than chance ones); modules: how often each is asked for, how long it is on its
way back, and how much longer an engine is away when the shelf is empty. Factors on turn times, removals and slots
are what sliders move.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from planner.demand import Demand, asked_per_day, away_chance, best_days
from planner.next_runs import shop_load
from planner.picture import Picture
from planner.scenario import stock_held
from planner.stock.indentures import EngineDemand, ModuleDemand
from sim.spec import TypeSpec

Floats = NDArray[np.float64]
SHORT_PERIOD_MONTHS, SHORT_PERIODS, LONG_PERIOD_MONTHS = 3, 12, 6  # quarters for three years, then half-years
_CAMPAIGN_DAYS = 182.6  # a campaign takes its engines off within half a year


@dataclass(frozen=True, slots=True, kw_only=True)
class Change:
    """What differs from the plan. ``turn`` scales the days in shops, ``turn_days`` adds to them; ``removals`` and
    ``slots`` scale those; ``campaign_frac`` of all engines comes off within half a year from the start;
    ``spread`` is put in place of the computed one. ``exchanges`` false: no module is exchanged, whatever lies on
    the shelf."""

    turn: float = 1.0
    turn_days: float = 0.0
    removals: float = 1.0
    slots: float = 1.0
    campaign_frac: float = 0.0
    spread: float | None = None
    exchanges: bool = True


class Model(NamedTuple):
    """One type ready for every stock. ``slots``: number of the module of each demand. ``mean_days``: days away of an
    engine that goes whole, over all causes. ``periods``: edges in days."""

    kind: TypeSpec
    engine: EngineDemand
    modules: tuple[ModuleDemand, ...]
    slots: tuple[int, ...]
    mean_days: float
    per_day: float
    wait_days: float
    load_frac: float
    periods: Floats


def model(view: Picture, demand: Demand, change: Change | None = None) -> Model:
    """Return the model of a type's demand, changed as asked."""
    change = change or Change()
    kind = view.setup.types[demand.engine_type]
    demand = _changed(view, demand, change)
    engine = _engine(view, kind, demand, change)
    slots = tuple(slot for slot in range(len(kind.modules)) if _is_stocked(demand, slot))
    asked, prices = asked_per_day(demand), module_prices(view, kind)
    modules = tuple(
        ModuleDemand(
            module=kind.modules[slot].module,
            per_day=float(asked[slot]),
            back_days=float(demand.back_days[slot]),
            price_usd=prices[slot],
            longer_days=_longer(view, demand, slot),
            held=demand.usable[kind.modules[slot].module],
        )
        for slot in slots
    )
    by_slot = demand.per_day().sum(axis=1)
    total = float(by_slot.sum())
    return Model(
        kind,
        engine,
        modules,
        slots,
        float(by_slot @ demand.whole_days) / total if total else 0.0,
        total,
        demand.shops.wait_days,
        demand.shops.load_frac,
        _period_edges(demand),
    )


def module_prices(view: Picture, kind: TypeSpec) -> tuple[float, ...]:
    """Return what a spare module costs new, with the parts in it."""
    rows = [m for m in view.fleet.module_types if m.engine_type == kind.engine_type]
    parts: dict[str, float] = {}
    for part in view.fleet.part_types:
        if part.engine_type == kind.engine_type:
            parts[part.module] = parts.get(part.module, 0.0) + part.price_usd
    return tuple(row.spare_price_usd + parts.get(row.module, 0.0) for row in rows)


def _is_stocked(demand: Demand, slot: int) -> bool:
    return not math.isnan(demand.exchange_days[slot]) and asked_per_day(demand)[slot] > 0.0


def _longer(view: Picture, demand: Demand, slot: int) -> float | None:
    """Return how much longer the engine is away with an empty shelf, or None where the strategy waits for the
    module."""
    strategy = view.strategy(demand.engine_type)
    if strategy.wait_for_module_days >= float(demand.back_days[slot]):
        return None
    return max(0.0, float(demand.whole_days[slot] - demand.exchange_days[slot]))


def _changed(view: Picture, demand: Demand, change: Change) -> Demand:
    """Return the demand with the change in rates, days and queue."""
    if change == Change():
        return demand
    wait = demand.shops.wait_days
    rates = (demand.rates if change.exchanges else demand.whole_rates) * change.removals
    if change.campaign_frac:
        until = _CAMPAIGN_DAYS
        inside = np.clip((np.minimum(demand.edges[1:], until) - demand.edges[:-1]) / until, 0.0, 1.0)
        rates = rates.copy()
        rates[:, :, -1, 0] += change.campaign_frac * inside
    found = demand._replace(rates=rates)
    if not change.exchanges:
        found = found._replace(exchange_days=np.full_like(found.exchange_days, math.nan), exchanged_frac=0.0)
    shops = [
        shop._replace(per_month=None if shop.per_month is None else shop.per_month * change.slots)
        for shop in view.setup.shops[demand.engine_type]
    ]
    months = float(demand.edges[-1]) / 365.25 * 12.0
    kinds = found.per_day().sum(axis=0)
    spread = float(kinds[1] / kinds.sum()) if kinds.sum() else 1.0
    load = shop_load(
        tuple(shops),
        float(rates.sum()) * (1.0 - found.exchanged_frac) / months,
        horizon_days=float(demand.edges[-1]),
        spread=spread,
    )

    def days(old: Floats) -> Floats:
        in_shop = np.maximum(0.0, old - wait)
        return np.asarray(np.where(old > 0.0, load.wait_days + in_shop * change.turn + change.turn_days, old))

    near = found.exchange_days < found.whole_days - wait  # an exchange near the wing waits for no slot
    exchanged = np.where(near, found.exchange_days, days(found.exchange_days))
    return found._replace(
        shops=load,
        whole_days=days(found.whole_days),
        exchange_days=exchanged,
        back_days=found.back_days * change.turn + change.turn_days,
    )


def _engine(view: Picture, kind: TypeSpec, demand: Demand, change: Change) -> EngineDemand:
    chance = away_chance(demand, best_days(demand))
    whole = np.vstack([chance, demand.away_now])
    monthly = whole.sum(axis=0)
    total = float(monthly.sum())
    spread = float((whole * (1.0 - whole)).sum()) / total if total else 1.0
    rates = demand.rates.sum(axis=(0, 2, 3))
    edges = _period_edges(demand)
    lengths = np.diff(edges)
    mean_rate = float(rates.sum()) / float(demand.edges[-1])
    weight = _by_period(rates, demand) / (lengths * mean_rate) if mean_rate else np.ones(lengths.size)
    days = np.diff(demand.edges)
    row = next(t for t in view.fleet.engine_types if t.engine_type == kind.engine_type)
    return EngineDemand(
        engine_type=kind.engine_type,
        means=_by_period(monthly * days, demand) / lengths,
        price_usd=row.spare_price_usd,
        spread=spread if change.spread is None else change.spread,
        weight=weight,
        taken=np.round(_by_period(demand.taken * days, demand) / lengths).astype(np.int64),
        share=lengths / lengths.sum(),
        held=stock_held(view.fleet)[kind.engine_type, "engine"],
    )


def _period_starts(demand: Demand) -> NDArray[np.int64]:
    """Return the number of the first month of each period."""
    fine = np.arange(SHORT_PERIODS) * SHORT_PERIOD_MONTHS
    rest = np.arange(SHORT_PERIODS * SHORT_PERIOD_MONTHS, max(demand.months, 1), LONG_PERIOD_MONTHS)
    starts = np.concatenate([fine, rest])
    return starts[starts < demand.months]


def _period_edges(demand: Demand) -> Floats:
    return np.append(demand.edges[_period_starts(demand)], demand.edges[-1])


def _by_period(monthly: Floats, demand: Demand) -> Floats:
    """Return sums of monthly values over each period."""
    return np.asarray(np.add.reduceat(monthly, _period_starts(demand)))
