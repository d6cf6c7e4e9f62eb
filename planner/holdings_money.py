"""What a holding costs: capital and keeping of the spares, shortages, and what exchanges save. Present value, USD.

Capital is the price at the start less the discounted price at the end, as the ledger counts stock; keeping falls
on spares that lie idle. A day on which an engine is short costs a mixture: the aircraft stands until an engine
can be leased in (at its chance, lead and retry times), then rent is paid; either way the own engines are not used
meanwhile, and what that saves is taken off. How long a shortage lasts follows from Little's law: engines short on
average over shortages a day, ``E (X - s)+ / (rate P(X >= s))``. An exchange saves what the cheaper of the other
two ways would have cost in work. Everything is escalated by its index and discounted by the middle of its period.
Costs that no stock moves are left out, so only differences between holdings mean something.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from planner.demand import Typical, typical_engine
from planner.holdings_model import Model, module_prices
from planner.picture import Picture
from planner.stock.indentures import Holding
from planner.ways_out import Off, costed_ways
from sim.fleet import Fleet
from sim.removal import Removal
from sim.spec import RESTORATION, TypeSpec

Floats = NDArray[np.float64]
_DAYS_LINES = ("spare tied up", "shelf", "aircraft down", "lease in")  # counted here through the days themselves


class Short(NamedTuple):
    """What a shortage costs: a day of standing and of renting, delivery of a rented engine, its least days, the
    days until
    one is expected (inf: none to be had), all in USD of today."""

    stand_day: float
    rent_day: float
    deliver: float
    least_days: float
    sought_days: float


class Money(NamedTuple):
    """Prices of one type over the horizon, present value.

    ``engine_capital``, ``module_capital``: of one for the whole horizon. ``*_idle_day``: keeping of one for a
    day, by period. ``saved_usd``: by an exchange of each module. ``down``, ``rent``, ``labour``: what a dollar of
    today's prices of these is worth in each period. ``lengths``: days of each period.
    """

    engine_capital: float
    module_capital: tuple[float, ...]
    engine_idle_day: Floats
    module_idle_day: Floats
    short: Short
    saved_usd: tuple[float, ...]
    down: Floats
    rent: Floats
    labour: Floats
    lengths: Floats


class Cost(NamedTuple):
    """Lines of a holding's cost, and their sum."""

    capital_usd: float
    keeping_usd: float
    short_usd: float
    exchange_usd: float

    @property
    def total_usd(self) -> float:
        return self.capital_usd + self.keeping_usd + self.short_usd + self.exchange_usd


def money(view: Picture, found: Model, saved_usd: Mapping[int, float]) -> Money:
    """Return the prices of a type; ``saved_usd``: what an exchange of each slot's module saves in work."""
    fleet, kind = view.fleet, found.kind
    middle = (found.periods[:-1] + found.periods[1:]) / 2.0
    rate = fleet.settings.discount_rate_frac
    discount = (1.0 + rate) ** (-middle / 365.25)
    rise = {index.index: index.per_year_frac for index in fleet.indices}

    def grown(index: str) -> Floats:
        return np.asarray((1.0 + rise.get(index, 0.0)) ** (middle / 365.25))

    years = float(found.periods[-1]) / 365.25
    keeping = fleet.settings.spare_keeping_frac_per_year / 365.25
    frames = sum(m.spare_price_usd for m in fleet.module_types if m.engine_type == kind.engine_type)
    frames = min(frames, found.engine.price_usd)
    parts = found.engine.price_usd - frames

    def capital(usd: float, index: str) -> float:
        return usd * (1.0 - math.pow((1.0 + rise.get(index, 0.0)) / (1.0 + rate), years))

    bare = {m.module: m.spare_price_usd for m in fleet.module_types if m.engine_type == kind.engine_type}
    prices = module_prices(view, kind)
    modules = [
        capital(bare[m.module], "material") + capital(prices[slot] - bare[m.module], "parts")
        for m, slot in zip(found.modules, found.slots, strict=True)
    ]
    idle = np.array([bare[m.module] for m in found.modules])[:, None] * keeping
    return Money(
        engine_capital=capital(frames, "material") + capital(parts, "parts"),
        module_capital=tuple(modules),
        engine_idle_day=found.engine.price_usd * keeping * grown("material") * discount,
        module_idle_day=idle * grown("material") * discount,
        short=short_prices(view, found),
        saved_usd=tuple(saved_usd.get(slot, 0.0) for slot in found.slots),
        down=grown("out_of_service") * discount,
        rent=grown("rent") * discount,
        labour=grown("labour") * discount,
        lengths=np.diff(found.periods),
    )


def short_prices(view: Picture, found: Model) -> Short:
    """Return what shortages of a type cost, what its own engines save meanwhile taken off."""
    kind, fleet = found.kind.engine_type, view.fleet
    row = next(t for t in fleet.engine_types if t.engine_type == kind)
    aircraft = [a for a in fleet.aircraft if a.engine_type == kind]
    count = max(1, len(aircraft))
    cycles = sum(a.cycles_per_year for a in aircraft) / count / 365.25
    hours = sum(a.hours_per_year for a in aircraft) / count / 365.25
    positions = sum(a.positions for a in aircraft) / count
    own_day = own_usd_per_cycle(view, found) * cycles
    stand = row.out_of_service_usd_per_day - positions * own_day
    market, after = view.setup.market.get(kind), view.strategy(kind).lease_in_after_days
    if market is None or after is None or market.chance <= 0.0:
        return Short(stand, 0.0, 0.0, 0.0, math.inf)
    rent = market.usd_per_month * 12.0 / 365.25
    used = market.usd_per_hour * hours + market.usd_per_cycle * cycles - own_day
    sought = after + market.retry_days * (1.0 / market.chance - 1.0) + market.lead_days
    return Short(stand, rent + used, market.deliver_usd, float(market.least_days), sought)


def own_usd_per_cycle(view: Picture, found: Model) -> float:
    """Return what a cycle of an own engine costs: life used, and its share of what visits cost beyond the life
    bought."""
    fleet, kind = view.fleet, found.kind.engine_type
    shops = [s for s in fleet.shops if s.engine_type == kind]
    level = next(
        (v.engine_level_usd + v.test_usd for v in fleet.visits if (v.engine_type, v.visit) == (kind, "core")), 0.0
    )
    ways = 2.0 * sum(s.engine_transport_usd for s in shops) / max(1, len(shops))
    opened = {found.kind.modules[i].module for i in found.kind.core}
    access = sum(
        w.access_usd for w in fleet.work if w.engine_type == kind and w.level == "restoration" and w.module in opened
    )
    flown = sum(a.cycles_per_year * a.positions for a in fleet.aircraft if a.engine_type == kind)
    a_removal = level + ways + access
    return own_life_usd_per_cycle(fleet, kind) + (a_removal * found.per_day * 365.25 / flown if flown else 0.0)


def own_life_usd_per_cycle(fleet: Fleet, kind: str) -> float:
    """Return what an own engine consumes in a cycle: parts over their limits, restorations over their intervals."""
    limits: dict[str, int] = {}
    for limit in fleet.part_limits:
        if not limit.directive:
            limits[limit.part_number] = max(limits.get(limit.part_number, 0), limit.limit_cycles)
    usd = sum(
        part.price_usd / limits[part.part_number]
        for part in fleet.part_types
        if part.engine_type == kind and limits.get(part.part_number)
    )
    return usd + sum(
        work.cost_usd / work.expected_interval_cycles
        for work in fleet.work
        if work.engine_type == kind and work.level == "restoration" and work.expected_interval_cycles
    )


def exchange_savings(view: Picture, kind: TypeSpec) -> dict[int, float]:
    """Return by slot what an exchange saves in work against the cheaper of the other ways out.

    For the type's middle engine as it is; days are not counted here. Does not depend on stock or rates: reckoned
    once.
    """
    typical = typical_engine(view, kind)
    return {} if typical is None else {slot: _saving(view, typical, slot) for slot in range(len(kind.modules))}


def _saving(view: Picture, typical: Typical, slot: int) -> float:
    engine, tail = typical
    seen = view.world.matching.view(view.tails[tail], engine, Removal(0, "unscheduled", slot))
    seen = seen._replace(least_level=max(seen.least_level, RESTORATION))
    cost: dict[str, float] = {}
    for way in costed_ways(Off(view, engine, tail, seen), shelf="full"):
        work = sum(line.cost_usd for line in way.lines if line.line not in _DAYS_LINES)
        cost[way.way] = min(work, cost.get(way.way, math.inf))
    return min(cost["A1"], cost["A2"]) - cost["B"]


def cost_of(found: Model, prices: Money, one: Holding) -> Cost:
    """Return what a holding costs over the horizon, as far as stock moves it."""
    weight = 1.0 if found.engine.weight is None else found.engine.weight
    taken = 0 if found.engine.taken is None else found.engine.taken
    cover = found.engine.by_period(np.array([one.added_mean]), one.engines)
    short = cover.short_mean[0, :, -1]
    idle = np.maximum(0.0, one.engines - taken - found.engine.means - one.added_mean * weight + short)
    keeping = float((idle * prices.engine_idle_day * prices.lengths).sum())
    capital = one.engines * prices.engine_capital
    saved = 0.0
    for i, (module, stock) in enumerate(zip(found.modules, one.modules, strict=True)):
        served = module.per_day * module.served_frac(stock)
        lying = max(0.0, stock - served * module.back_days)
        keeping += lying * float((prices.module_idle_day[i] * prices.lengths).sum())
        capital += stock * prices.module_capital[i]
        saved += served * prices.saved_usd[i] * float((prices.labour * prices.lengths).sum())
    below = cover.cover_frac[0, :, -2] if one.engines else np.zeros(short.size)
    return Cost(capital, keeping, shortage_usd(found, prices, short, 1.0 - below), -saved)


def standing_frac(found: Model, prices: Money, short: Floats, met: Floats) -> Floats:
    """Return the share of shortages' days that aircraft stand: until an engine can be leased in.

    ``short``: engines short on average; ``met``: chance that a removal meets an empty shelf; both by period.
    """
    events = np.maximum(found.per_day * met, 1e-12)
    length = np.maximum(short / events, 1e-9)
    if math.isinf(prices.short.sought_days):
        return np.ones_like(short)
    return np.asarray(-np.expm1(-prices.short.sought_days / length))


def shortage_usd(found: Model, prices: Money, short: Floats, met: Floats) -> float:
    """Return the present cost of shortages (see ``standing_frac`` for the arguments)."""
    stands = standing_frac(found, prices, short, met)
    rented = 1.0 - stands
    # an engine rented for less than its least term is paid for that
    length = np.maximum(short / np.maximum(found.per_day * met, 1e-12), 1e-9)
    stay = np.maximum(length, 1e-9)
    paid = np.maximum(stay, prices.short.least_days) / stay
    rent = prices.short.rent_day * paid + prices.short.deliver / stay
    day = stands * prices.short.stand_day * prices.down + rented * rent * prices.rent
    return float((short * day * prices.lengths).sum())
