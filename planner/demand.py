"""The demand for spares that a fleet makes, month by month: removals by module and kind, and engines away.

Each position of each aircraft is followed apart (planner/renewals.py). Whatever it removes in a month is away for the
mean time of its way out, so the chance that it has an engine away is known for every month; over positions those
chances add up to the law of engines away (Poisson-binomial), which is narrower than Poisson where dates are sure, and
near it where they are not.

Rates are kept by position, month, slot (the last one is the whole engine: margin, lease ends) and kind (planned,
chance).
"""

from __future__ import annotations

import math
from dataclasses import replace
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from planner.causes_ahead import Months, ahead, month_edges
from planner.next_runs import (
    ShopLoad,
    exchange_days,
    expected_scope,
    module_back_days,
    next_run,
    shop_load,
    visit_days,
)
from planner.picture import Picture, picture
from planner.renewals import Position, Renewing, overlap, removal_rates
from sim.errors import RequestError
from sim.fleet import Fleet
from sim.queues import erlang_loss
from sim.spec import TypeSpec
from sim.state import EngineState

Floats = NDArray[np.float64]
Typical = tuple[EngineState, str]
_MONTHS_A_YEAR = 12.0
_INSIDE = (np.arange(32) + 0.5) / 32.0  # removals are spread evenly over their month


class Demand(NamedTuple):
    """The demand of one type under one strategy.

    ``edges``: months, shape (months + 1,), days. ``rates``: removals that ask for a spare, shape (positions,
    months, slots + 1, 2). ``whole_days``, ``exchange_days``: days away by slot (the last: whole engine), shape
    (slots + 1,); nan where nothing is exchanged. ``back_days``: days until a module taken off is on the shelf
    again, shape (slots,). ``away_now``: share of each month for which each engine that is in a shop today is
    still away, shape (engines, months). ``taken``: spares that fill positions for good, shape (months,).
    ``worst_slot``: the module that an engine without margin has exchanged. ``exchanged_frac``: share of removals
    that find a module on today's shelf.
    """

    engine_type: str
    strategy: str
    edges: Floats
    positions: tuple[Position, ...]
    rates: Floats
    whole_rates: Floats
    whole_days: Floats
    exchange_days: Floats
    back_days: Floats
    shops: ShopLoad
    away_now: Floats
    taken: NDArray[np.int64]
    worst_slot: int
    usable: dict[str, int]
    feasible: tuple[float, float]
    exchanged_frac: float

    @property
    def months(self) -> int:
        return self.edges.size - 1

    def per_day(self) -> Floats:
        """Return removals a day over all months by slot and kind, shape (slots + 1, 2)."""
        total: Floats = self.rates.sum(axis=(0, 1)) / float(self.edges[-1])
        return total


def demands(
    fleet: Fleet, strategy: str, *, months: int, flown_as: Fleet | None = None
) -> tuple[Picture, tuple[Demand, ...]]:
    """Return the demand of every type over so many months, and the picture that it was read from.

    ``flown_as``: the same fleet with another use, derate or base from today on; what its modules have lost by
    today, and how fast each wears of its own, stays what was measured as they were flown. Raises RequestError for
    a strategy that the fleet does not have, or a span outside 1 to 480 months.
    """
    rows = {row.strategy: row for row in fleet.strategies}
    if strategy not in rows:
        raise RequestError("--strategy", strategy, f"one of {', '.join(rows)}", "or add it to strategies.csv")
    if not 1 <= months <= 480:
        raise RequestError("months ahead", str(months), "1 to 480")
    view = picture(replace(fleet, strategies=(rows[strategy],)))
    if flown_as is not None:
        changed = picture(replace(flown_as, strategies=(rows[strategy],)))
        for serial, module in changed.modules.items():
            measured = view.modules[serial]
            module.loss, module.permanent, module.factor = measured.loss, measured.permanent, measured.factor
        view = changed
    edges = month_edges(fleet.settings.as_of, months)
    exchanges = rows[strategy].way_out != "whole_engine"
    return view, tuple(_of_type(view, kind, strategy, edges, exchanges=exchanges) for kind in view.setup.types.values())


def _of_type(view: Picture, kind: TypeSpec, strategy: str, edges: Floats, *, exchanges: bool) -> Demand:
    positions = _positions(view, kind, exchanges=exchanges)
    typical = _typical(view, positions)
    slots, name = len(kind.modules), kind.engine_type
    worst = _worst_slot(view, typical) if typical else -1
    renewing = Renewing(_renewing(view, kind, typical), frozenset({worst} if worst >= 0 else ()))
    pool = view.world.engine_pools[name].engines
    spares = [ahead(view, one, typical[1], dated=False) for one in pool if one.modules] if typical else []

    months = Months(edges)

    def rates_at(share: float) -> Floats:
        return removal_rates(positions, spares, months, slots=slots, renewing=renewing, exchanged_frac=share)

    whole_rates = rates_at(0.0)
    bare = Demand(
        engine_type=name,
        strategy=strategy,
        edges=edges,
        positions=positions,
        rates=whole_rates,
        whole_rates=whole_rates,
        whole_days=np.zeros(slots + 1),
        exchange_days=np.full(slots + 1, math.nan),
        back_days=np.zeros(slots),
        shops=ShopLoad(math.inf, 0.0, 0.0),
        away_now=_away_now(view, name, edges),
        taken=_taken(view, name, edges),
        worst_slot=worst,
        usable=usable_modules(view, kind),
        feasible=_feasible(view, positions, name) if exchanges else (0.0, 0.0),
        exchanged_frac=0.0,
    )
    found = _with_days(view, kind, bare, typical, exchanges=exchanges)
    share = served_frac(found, kind) if exchanges else 0.0
    if share > 0.0:
        found = found._replace(rates=rates_at(share), exchanged_frac=share)
        found = _with_days(view, kind, found, typical, exchanges=exchanges)
    return found


def _positions(view: Picture, kind: TypeSpec, *, exchanges: bool) -> tuple[Position, ...]:
    found = []
    for tail, process in view.tails.items():
        if process.spec is not kind:
            continue
        for number, engine in enumerate(process.engines, start=1):
            if engine is not None:
                one = ahead(view, engine, tail)
                whole = next_run(view, one, exchanged=False)
                other = next_run(view, one, exchanged=True) if exchanges else None
                found.append(Position(tail, number, engine.serial, one, whole, other))
    return tuple(found)


def usable_modules(view: Picture, kind: TypeSpec) -> dict[str, int]:
    """Return by module how many owned ones outside engines may mate with at least half of the type's flying
    engines."""
    flying = [
        (process, engine)
        for process in view.tails.values()
        if process.spec is kind
        for engine in process.engines
        if engine is not None and engine.modules
    ]
    found = {module.module: 0 for module in kind.modules}
    for row in view.fleet.modules:
        if row.engine_type == kind.engine_type and not row.engine_serial:
            state = view.modules[row.module_serial]
            fits = sum(view.world.matching.may_mate(process, engine, state) for process, engine in flying)
            found[row.module] += fits * 2 >= len(flying)
    return found


def served_frac(demand: Demand, kind: TypeSpec) -> float:
    """Return the share of removals that find the module they ask for on today's shelf (Erlang's loss)."""
    asked = asked_per_day(demand)
    served = 0.0
    for slot, module in enumerate(kind.modules):
        if asked[slot] > 0.0 and not math.isnan(demand.exchange_days[slot]):
            lost = erlang_loss(demand.usable[module.module], float(asked[slot]) * float(demand.back_days[slot]))
            served += asked[slot] * (1.0 - lost)
    total = float(demand.per_day().sum())
    return served / total if total > 0.0 else 0.0


def asked_per_day(demand: Demand) -> Floats:
    """Return how often a day each module is what an engine comes off for; margin asks for the one that has lost
    most."""
    rates = demand.per_day().sum(axis=1)
    asked: Floats = rates[:-1].copy()
    if demand.worst_slot >= 0:
        asked[demand.worst_slot] += rates[-1]
    return asked


def _feasible(view: Picture, positions: tuple[Position, ...], kind: str) -> tuple[float, float]:
    """Return the share of planned and of chance removals after which an exchange carries the engine past the stub."""
    stub = view.strategy(kind).stub_cycles
    after = [one.exchanged.after for one in positions if one.exchanged is not None]
    planned = [not one.planned or one.planned[0].cycles >= stub for one in after]
    chance = [not one.ahead.planned or one.ahead.planned[0].cycles >= stub for one in positions]
    return float(np.mean(planned)) if planned else 0.0, float(np.mean(chance)) if chance else 0.0


def _with_days(view: Picture, kind: TypeSpec, demand: Demand, typical: Typical | None, *, exchanges: bool) -> Demand:
    """Return the demand with the days away by slot: whole, exchanged, and a module's way back to the shelf."""
    months = float(demand.edges[-1]) / 365.25 * _MONTHS_A_YEAR
    shops = view.setup.shops[kind.engine_type]
    inducted = float(demand.rates.sum()) * (1.0 - demand.exchanged_frac) / months
    # planned removals repeat with the runs and hardly add to what varies in the long run; chance ones are Poisson
    rates = demand.per_day().sum(axis=0)
    spread = float(rates[1] / rates.sum()) if rates.sum() > 0.0 else 1.0
    load = shop_load(shops, inducted, horizon_days=float(demand.edges[-1]), spread=spread)
    slots = len(kind.modules)
    whole, exchanged = np.zeros(slots + 1), np.full(slots + 1, math.nan)
    for slot in range(slots + 1 if typical else 0):
        assert typical is not None
        cause, of_slot = ("margin", -1) if slot == slots else ("distress", slot)
        scope = expected_scope(view, *typical, cause=cause, slot=of_slot)
        whole[slot] = load.wait_days + visit_days(shops, scope.visit)
        if exchanges and slot < slots:
            exchanged[slot] = exchange_days(view, kind, slot, shops, wait_days=load.wait_days)
    if exchanges and demand.worst_slot >= 0:
        # who runs out of margin has the module exchanged that has lost most
        exchanged[slots] = exchanged[demand.worst_slot]
    asked = float(asked_per_day(demand).sum()) * 365.25 / _MONTHS_A_YEAR
    back = np.array([module_back_days(view, kind, slot, per_month=asked) for slot in range(slots)])
    return demand._replace(whole_days=whole, exchange_days=exchanged, back_days=back, shops=load)


def _typical(view: Picture, positions: tuple[Position, ...]) -> Typical | None:
    """Return the engine in the middle of its type by the day of its first planned cause, and its tail."""
    known = [one for one in positions if view.engines[one.engine_serial].modules]
    known.sort(key=lambda one: (one.ahead.planned_day, one.engine_serial))
    if not known:
        return None
    middle = known[len(known) // 2]
    return view.engines[middle.engine_serial], middle.tail


def typical_engine(view: Picture, kind: TypeSpec) -> Typical | None:
    """Return the engine in the middle of its type by the day of its first planned cause, and its tail; None
    without."""
    return _typical(view, _positions(view, kind, exchanges=False))


def _renewing(view: Picture, kind: TypeSpec, typical: Typical | None) -> frozenset[int]:
    """Return the slots whose repair, when the engine goes whole, opens the core and so starts a new run."""
    if typical is None:
        return frozenset()
    found = []
    for slot in range(len(kind.modules)):
        scope = expected_scope(view, *typical, cause="unscheduled", slot=slot)
        found += [slot] if scope.visit in ("core", "overhaul") else []
    return frozenset(found)


def _worst_slot(view: Picture, typical: Typical) -> int:
    """Return the slot of the module that has lost most margin."""
    engine, tail = typical
    rating = view.tails[tail].flying.rating
    return max(engine.modules, key=lambda m: (m.lost_degC(rating), -m.spec.slot)).spec.slot


def _away_now(view: Picture, kind: str, edges: Floats) -> Floats:
    """Return for each engine in a shop today the share of each month in which it is still away."""
    rows = []
    for row in view.fleet.engines:
        if row.engine_type == kind and row.place == "shop":
            ready = row.ready_day
            if ready is None:
                ready = visit_days(view.setup.shops[kind], row.visit or "core")
            rows.append(overlap(edges, 0.0, max(0.0, ready)))
    return np.array(rows) if rows else np.zeros((0, edges.size - 1))


def _taken(view: Picture, kind: str, edges: Floats) -> NDArray[np.int64]:
    """Return by month how many spares fill positions for good: positions that operate less engines that came with
    them.

    A leased-in engine that goes back leaves its position to a spare; one that lies idle is a spare until then; an own
    engine whose tail exits becomes one.
    """
    middle = (edges[:-1] + edges[1:]) / 2.0
    taken = np.zeros(middle.size, dtype=np.int64)
    for row in view.fleet.engines:
        if row.engine_type == kind and row.place == "leased_in" and not row.tail:
            until = math.inf if row.lease_in_until_day is None else row.lease_in_until_day
            taken -= (middle < until).astype(np.int64)
    for tail, process in view.tails.items():
        if process.row.engine_type != kind:
            continue
        start, end = process.row.entry_day or 0.0, _end_day(view, tail)
        operating = (middle >= start) & (middle < end)
        for engine in process.engines:
            there = np.zeros(middle.size, dtype=bool)
            if engine is not None:
                stays = end if engine.owner in view.setup.lessors else math.inf
                there = (middle >= start) & (middle < min(engine.lease_end, stays))
            taken += operating.astype(np.int64) - there.astype(np.int64)
    return taken


def _end_day(view: Picture, tail: str) -> float:
    lease, row = view.lease_of(tail), view.tails[tail].row
    leaves = lease.return_day if lease is not None and lease.after_return == "leave" else math.inf
    return min(leaves, row.exit_day if row.exit_day is not None else math.inf)


def stay_weights(days: float, lengths: Floats) -> Floats:
    """Return how much of month m + j an engine removed in month m is away: shape (months,), by j.

    Removals are even over their month; all months count as long as the mean one.
    """
    stay = days / float(lengths.mean())
    lag = np.arange(lengths.size)[:, None]
    inside = np.minimum(_INSIDE + stay, lag + 1.0) - np.maximum(_INSIDE, lag)
    return np.asarray(np.clip(inside, 0.0, None).mean(axis=1))


def away_chance(demand: Demand, days: Floats) -> Floats:
    """Return the chance that each position has an engine away in each month, given the days away.

    ``days``: by slot, or by slot and kind, shape (slots + 1,) or (slots + 1, 2). Shape of the result: (positions,
    months). A position never counts for more than one.
    """
    by_kind = np.broadcast_to(days[:, None] if days.ndim == 1 else days, demand.rates.shape[2:])
    months, lengths = demand.months, np.diff(demand.edges)
    found = np.zeros(demand.rates.shape[:2])
    for (slot, which), stay in np.ndenumerate(by_kind):
        rate = demand.rates[:, :, slot, which]
        if not stay > 0.0 or not rate.any():
            continue
        for lag, weight in enumerate(stay_weights(float(stay), lengths).tolist()):
            if weight <= 0.0:
                break
            found[:, lag:] += weight * rate[:, : months - lag]
    return np.minimum(found, 1.0)


def mean_days(demand: Demand) -> Floats:
    """Return the expected days away by slot at today's shelf: exchanged as often as the shelf serves, else whole."""
    exchanged = np.where(np.isnan(demand.exchange_days), demand.whole_days, demand.exchange_days)
    share = demand.exchanged_frac
    return np.asarray((1.0 - share) * demand.whole_days + share * exchanged)


def best_days(demand: Demand) -> Floats:
    """Return the expected days away by slot and kind if the shelf were never empty, shape (slots + 1, 2)."""
    exchanged = np.where(np.isnan(demand.exchange_days), demand.whole_days, demand.exchange_days)
    share = np.array(demand.feasible)
    return np.asarray(exchanged[:, None] * share + demand.whole_days[:, None] * (1.0 - share))
