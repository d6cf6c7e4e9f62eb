"""Three ways out for one engine: its own module repaired (A1), the core visit brought forward (A2), an exchange (B).

Each is costed for this engine with every line shown, with the shelf full (a spare engine ties up capital, the module
that is wanted lies ready) and with the shelf empty (the aircraft stands or an engine is leased in, and the exchange
waits for the engine's own module to come back from repair).
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import NamedTuple

from planner.after_work import after_exchange, after_repair, after_visit
from planner.picture import Picture, foreseen
from planner.run_ahead import expected_run_cycles
from planner.way_cost import (
    Line,
    Stay,
    exchange_lines,
    is_shop_exchange,
    later_line,
    paid,
    stay_for,
    visit_lines,
    without_lines,
)
from sim.state import EngineState, ModuleState
from sim.view import Scope, View
from sim.workscope import exchange_scope, repair_level, scope_of

SHELVES = ("full", "empty")


class Way(NamedTuple):
    """One way out, costed. ``run_cycles`` is the expected run after it, ``limit_cycles`` the planned one.

    ``module_serial`` is the module that goes in (B), blank when none lies on the shelf and one like the engine's own
    after its repair is supposed. ``back_day`` is when the engine can fly again.
    """

    way: str
    shelf: str
    lines: tuple[Line, ...]
    days_without: float
    back_day: float
    run_cycles: float
    limit_cycles: int
    limit_cause: str
    margin_degC: float
    module_serial: str
    slots: tuple[int, ...]
    scope: Scope
    stay: Stay | None

    @property
    def cost_usd(self) -> float:
        return sum(line.cost_usd for line in self.lines)

    @property
    def cash_usd(self) -> float:
        return sum(line.cash_usd for line in self.lines if line.line not in ("life bought", "spare tied up", "shelf"))


class Off(NamedTuple):
    """An engine off the wing, or about to be: the picture of that day, its state, its tail, and what a planner sees."""

    view: Picture
    engine: EngineState
    tail: str
    seen: View


def costed_ways(off: Off, *, shelf: str, begin: float | None = None) -> tuple[Way, ...]:
    """Return A1, A2 and, for each module that could go in, B; the share of later core visits is settled among them."""
    view, seen = off.view, off.seen
    strategy = view.strategy(seen.spec.engine_type)
    goal, stub = strategy.build_goal_cycles, strategy.stub_cycles
    ways = []
    for name, only, reach in (("A1", True, stub), ("A2", False, _stub_that_opens_the_core(seen, stub))):
        scope = scope_of(seen, goal_cycles=goal, stub_cycles=reach, only_cause=only, catalogue=view.setup.catalogue)
        shops = range(len(seen.shops))
        shop_ways = [_visit_way(off, name, scope, shop=shop, shelf=shelf, begin=begin) for shop in shops]
        ways.append(min(shop_ways, key=lambda way: (way.cost_usd, way.stay.shop if way.stay else 0)))
    ways += [_exchange_way(off, slots, modules, shelf=shelf) for slots, modules in _candidates(off, shelf=shelf)]
    return with_later(off, ways)


def _stub_that_opens_the_core(seen: View, stub: int) -> int:
    """Return the stub rule under which every core module with parts is opened: A2 is a core visit, whatever is left."""
    core = [m.least_left for m in seen.modules if m.slot in seen.spec.core and m.parts]
    return max([stub, *(left + 1 for left in core)])


def with_later(off: Off, ways: Sequence[Way]) -> tuple[Way, ...]:
    """Return the ways with their share of later core visits inside the window that ends with the longest run."""
    window = max(way.run_cycles for way in ways)
    serves = next(way.run_cycles for way in ways if way.way == "A2")
    return tuple(
        way._replace(
            lines=(
                *way.lines,
                later_line(off.view, off.seen, run_cycles=way.run_cycles, window_cycles=window, serves_cycles=serves),
            )
        )
        for way in ways
    )


def _visit_way(off: Off, name: str, scope: Scope, *, shop: int, shelf: str, begin: float | None) -> Way:
    view, seen = off.view, off.seen
    stay = stay_for(seen, scope, shop=shop, begin=begin)
    lines = [paid(view, "engine change", "engine_change", seen.spec.engine_type, day=seen.day)]
    lines += visit_lines(view, seen, off.engine, scope, stay)
    lines += without_lines(view, seen, day=seen.day, days=stay.back - seen.day, shelf=shelf)
    built = after_visit(view, off.engine, scope, rating=seen.rating, day=stay.released)
    return _way(off, name, built, lines=lines, back=stay.back, scope=scope, stay=stay, shelf=shelf)


def _candidates(off: Off, *, shelf: str) -> list[tuple[tuple[int, ...], tuple[ModuleState | None, ...]]]:
    """Return the exchanges worth looking at: each module on the shelf for the slot that limits, or for the slots that
    have lost most margin; None stands for a module like the engine's own after repair."""
    seen = off.seen
    slots = [seen.slot] if seen.slot >= 0 else [
        m.slot for m in sorted(seen.modules, key=lambda m: (-m.lost_degC, m.slot))[:2]
    ]  # fmt: skip
    found: list[tuple[tuple[int, ...], tuple[ModuleState | None, ...]]] = []
    if shelf == "full":
        for slot in slots:
            found += [((slot,), (off.view.modules[m.serial],)) for m in seen.pool if m.slot == slot]
    return found or [((slots[0],), (None,))]


def _exchange_way(off: Off, slots: tuple[int, ...], modules: tuple[ModuleState | None, ...], *, shelf: str) -> Way:
    view, seen = off.view, off.seen
    lines: list[Line] = []
    put_in: dict[int, ModuleState] = {}
    away = 0.0
    for slot, module in zip(slots, modules, strict=True):
        own, as_seen = off.engine.modules[slot], seen.modules[slot]
        level = repair_level(as_seen, seen.spec, cause=seen.cause, least_level=seen.least_level)
        goal = view.strategy(seen.spec.engine_type).build_goal_cycles
        short = tuple(i for i, p in enumerate(as_seen.parts) if p.left_cycles < min(goal, p.limit_cycles))
        stocked = shelf == "full"
        lines += exchange_lines(view, seen, own, day=seen.day, level=level, replace=short, from_shelf=stocked)
        shop = min(seen.shops, key=lambda one: one.module_start_day)
        away = max(away, shop.module_start_day + own.spec.repair.mean_days + shop.transport_days - seen.day)
        put_in[slot] = module or after_repair(
            view, own, level=level, replace=short, rating=seen.rating, day=seen.day + away
        )
    back, stay, scope, more = _exchange_stay(off, slots, wait=away if shelf == "empty" else 0.0)
    lines += more
    days = back - seen.day
    if all(seen.spec.modules[slot].place == "wing" for slot in slots) and shelf == "full":
        cash = days * view.price("downtime", seen.spec.engine_type, day=seen.day)
        lines.append(Line("aircraft down", cash * view.discount(seen.day), cash, seen.day))
    else:
        lines.append(paid(view, "engine change", "engine_change", seen.spec.engine_type, day=seen.day))
        lines += without_lines(view, seen, day=seen.day, days=days, shelf=shelf)
    built = after_exchange(off.engine, put_in)
    serial = next((module.serial for module in modules if module is not None), "")
    way = _way(off, "B", built, lines=lines, back=back, scope=scope, stay=stay, shelf=shelf)
    return way._replace(module_serial=serial, slots=slots)


def _exchange_stay(off: Off, slots: tuple[int, ...], *, wait: float) -> tuple[float, Stay | None, Scope, list[Line]]:
    """Return when an exchange is done, its stay in a shop if it needs one, its scope, and its cost without modules."""
    view, seen = off.view, off.seen
    scope = exchange_scope(seen, slots)
    if is_shop_exchange(seen, slots):
        stays = [stay_for(seen, scope, shop=shop) for shop in range(len(seen.shops))]
        priced = [(sum(x.cost_usd for x in visit_lines(view, seen, off.engine, scope, s)), s.shop, s) for s in stays]
        stay = min(priced)[2]
        return max(stay.back, seen.day + wait), stay, scope, visit_lines(view, seen, off.engine, scope, stay)
    work = sum(seen.spec.modules[slot].exchange_days for slot in slots)
    start = max(seen.team_start_day, seen.day + wait)
    lines = []
    if view.world.teams:
        number = view.world.matching.team_for(seen.spec.engine_type, seen.day, work)
        team = view.world.teams[number][0].team
        lines.append(paid(view, "call-out", "call_out", team, seen.spec.engine_type, day=seen.day))
    return start + work, None, scope, lines


def _way(
    off: Off,
    name: str,
    built: EngineState,
    *,
    lines: list[Line],
    back: float,
    scope: Scope,
    stay: Stay | None,
    shelf: str,
) -> Way:
    view = off.view
    ahead = foreseen(view, built, off.tail, day=back)
    flying = view.tails[off.tail].flying
    return Way(
        way=name,
        shelf=shelf,
        lines=tuple(lines),
        days_without=back - off.seen.day,
        back_day=back,
        run_cycles=expected_run_cycles(built.modules, flying, planned_cycles=ahead.cycles),
        limit_cycles=ahead.cycles,
        limit_cause=ahead.cause,
        margin_degC=built.margin_degC(flying.rating),
        module_serial="",
        slots=(),
        scope=scope,
        stay=stay,
    )
