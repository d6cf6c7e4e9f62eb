"""What one way out for one engine costs, line by line: cash on its day, present value, life bought, days without.

The basis is consumption: what a visit pays for life that it adds is given back as the value of that life, so a part
replaced early costs its stub and a restoration done early the share that it throws away. Prices are the catalogue's,
escalated to the day of payment; turn times and queues are the shops' means. Every way is charged its share of the next
core visit inside a common window, since a way that lasts longer puts that visit off (sim/strategy.py has the same
reading for the simulation).
"""

from __future__ import annotations

from typing import NamedTuple

from planner.picture import DAYS_PER_YEAR, Picture
from sim.spec import CHECK, CORE_PLACE, LEVELS, RESTORATION
from sim.state import EngineState, ModuleState
from sim.view import Scope, View


class Line(NamedTuple):
    """One line of cost: what it is, present value and cash in USD, and the day on which it falls."""

    line: str
    cost_usd: float
    cash_usd: float
    day: float


class Stay(NamedTuple):
    """When work on an engine in a shop begins and ends, when the engine is back, and in which shop (its number)."""

    shop: int
    begin: float
    released: float
    back: float


def paid(view: Picture, line: str, *key: str, day: float, amount: float = 1.0) -> Line:
    """Return one catalogue item as a line."""
    cash = amount * view.price(*key, day=day)
    return Line(line, cash * view.discount(day), cash, day)


def stay_for(seen: View, scope: Scope, *, shop: int, begin: float | None = None) -> Stay:
    """Return the expected stay of an engine that leaves now, or whose slot is on ``begin``."""
    one = seen.shops[shop]
    start = one.engine_start_day if begin is None else max(begin, seen.day + one.transport_days)
    released = start + one.turn_days.get(scope.visit, max(one.turn_days.values(), default=0.0))
    return Stay(shop, start, released, released + one.transport_days)


def visit_lines(view: Picture, seen: View, engine: EngineState, scope: Scope, stay: Stay) -> list[Line]:
    """Return what a shop visit pays for: moves, engine level, test, access, work by module, parts, life added."""
    kind, shop = seen.spec.engine_type, seen.shops[stay.shop].shop
    payday = stay.released + view.setup.shops[kind][stay.shop].pay_days
    lines = [
        paid(view, "transport", "transport", "engine", kind, shop, day=stay.begin, amount=2.0),
        paid(view, "engine level", "engine_level", kind, scope.visit, shop, day=payday),
        paid(view, "test", "test", kind, scope.visit, shop, day=payday),
    ]
    for module in engine.modules:
        level = scope.levels[module.spec.slot]
        if level:
            name = (kind, module.spec.module, LEVELS[level], shop)
            what = "own repair" if module.spec.slot == seen.slot else "other modules"
            lines.append(paid(view, "access", "access", *name, day=payday))
            lines.append(paid(view, what, "work", *name, day=payday))
        lines += repair_lines(view, module, scope, rating=seen.rating, payday=payday)
    return lines


def repair_lines(view: Picture, module: ModuleState, scope: Scope, *, rating: int, payday: float) -> list[Line]:
    """Return the parts of one module's work and the value of the life that work and parts add."""
    spec, slot, lines = module.spec, module.spec.slot, []
    for number in scope.replace[slot]:
        part = module.parts[number]
        left = part.fraction_left(module.run, rating, payday) if part.known else 0.0
        lines.append(paid(view, "parts", "part", part.spec.part_number, day=payday))
        lines.append(paid(view, "life bought", "part", part.spec.part_number, day=payday, amount=left - 1.0))
    if scope.levels[slot] >= RESTORATION:
        used = min(1.0, max(module.csr / spec.interval_cycles, module.hsr / spec.interval_hours))
        key = ("life", "start", spec.engine_type, spec.module)
        lines.append(paid(view, "life bought", *key, day=payday, amount=-used))
    return lines


def exchange_lines(
    view: Picture,
    seen: View,
    module: ModuleState,
    *,
    day: float,
    level: int,
    replace: tuple[int, ...],
    from_shelf: bool,
) -> list[Line]:
    """Return what taking a module off, and repairing it on its own, pays for (the engine's stay not included).

    ``from_shelf``: a module of the shelf goes in, so the shelf lacks one until the repair is back.
    """
    kind, name, slot = seen.spec.engine_type, module.spec.module, module.spec.slot
    shop = min(seen.shops, key=lambda one: (one.module_start_day, one.shop))
    number = seen.shops.index(shop)
    released = max(day, shop.module_start_day) + module.spec.repair.mean_days
    payday = released + view.setup.shops[kind][number].pay_days
    levels = tuple(level if i == slot else 0 for i in range(len(seen.modules)))
    parts = tuple(replace if i == slot else () for i in range(len(seen.modules)))
    lines = [
        paid(view, "exchange", "exchange", kind, name, day=day),
        paid(view, "transport", "transport", "module", kind, shop.shop, day=day, amount=2.0),
    ]
    if level:
        lines.append(paid(view, "own repair", "work", kind, name, LEVELS[level], shop.shop, day=payday))
    lines += repair_lines(view, module, Scope("", levels, parts), rating=seen.rating, payday=payday)
    if from_shelf:
        away = released - day + shop.transport_days
        capital = view.world.rate_frac / DAYS_PER_YEAR * away
        lines.append(paid(view, "shelf", "stock", "start", kind, name, day=day, amount=capital))
    return lines


def without_lines(view: Picture, seen: View, *, day: float, days: float, shelf: str) -> list[Line]:
    """Return what the days without the engine cost.

    With a full shelf a spare is tied up for all of them (capital and keeping). With an empty shelf the aircraft stands
    until an engine leased in is expected and rent is paid for the rest, or it stands to the end where that is cheaper
    or nothing can be leased.
    """
    kind, spec = seen.spec.engine_type, seen.spec
    tied = view.world.rate_frac / DAYS_PER_YEAR * spec.spare_price_usd * days
    lines = [Line("spare tied up", tied * view.discount(day), tied, day)]
    if shelf == "full":
        return lines
    market = view.setup.market.get(kind)
    down_day = view.price("downtime", kind, day=day)
    grounded = Line("aircraft down", days * down_day * view.discount(day), days * down_day, day)
    if market is None or not market.chance:
        return [grounded]
    waited = min(days, market.lead_days + market.retry_days * (1.0 / market.chance - 1.0))
    rented = max(days - waited, float(market.least_days)) if days > waited else 0.0
    down = waited * down_day
    rent = rented * view.price("lease_in", kind, "day", day=day)
    rent += view.price("lease_in", kind, "delivery", day=day) if rented else 0.0
    flown = (days - waited) / DAYS_PER_YEAR * seen.cycles_per_year
    rent += flown * view.price("lease_in", kind, "cycle", day=day)
    rent += flown * seen.hours_per_cycle * view.price("lease_in", kind, "hour", day=day)
    if down + rent >= grounded.cash_usd:
        return [grounded]
    worth = view.discount(day)
    return [Line("aircraft down", down * worth, down, day), Line("lease in", rent * worth, rent, day)]


def core_overhead_usd(view: Picture, seen: View) -> float:
    """Return what a core visit costs beyond the life it buys, at today's prices: the least over the shops."""
    kind, spec = seen.spec.engine_type, seen.spec
    opened = {slot for core in spec.core for slot in (core, *spec.modules[core].behind)}
    capital = view.world.rate_frac / DAYS_PER_YEAR * spec.spare_price_usd
    best = []
    for shop in seen.shops:
        usd = view.price("engine_level", kind, "core", shop.shop, day=0.0)
        usd += view.price("test", kind, "core", shop.shop, day=0.0)
        usd += 2.0 * view.price("transport", "engine", kind, shop.shop, day=0.0)
        for slot in opened:
            level = RESTORATION if slot in spec.core else CHECK
            name = (kind, spec.modules[slot].module, LEVELS[level], shop.shop)
            usd += view.price("access", *name, day=0.0)
            usd += view.price("work", *name, day=0.0) if level == CHECK else 0.0
        days = 2.0 * shop.transport_days + shop.turn_days.get("core", 0.0)
        best.append(usd + days * capital)
    return min(best, default=0.0) + view.price("engine_change", kind, day=0.0)


def later_line(view: Picture, seen: View, *, run_cycles: float, window_cycles: float, serves_cycles: float) -> Line:
    """Return a way's share of core visits after its run, inside the common window.

    A visit at the end of the run serves ``serves_cycles``; inside the window it is charged for what it serves there.
    """
    day = seen.day + run_cycles / seen.cycles_per_year * DAYS_PER_YEAR
    share = max(0.0, window_cycles - run_cycles) / max(1.0, serves_cycles)
    cash = core_overhead_usd(view, seen) * share
    return Line("later core visit", cash * view.discount(day), cash, day)


def is_shop_exchange(seen: View, slots: tuple[int, ...]) -> bool:
    return any(seen.spec.modules[slot].place == CORE_PLACE for slot in slots)
