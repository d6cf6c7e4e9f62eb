"""The decision at a removal: the whole engine to a shop, an exchange of modules, or the cheaper of the ways out.

Three ways (common practice, no source): A1, the whole engine for the module that limits only; A2, the next core visit
brought forward and built for the goal; B, exchange now and the core visit later as planned. A decision sees a ``View``
and nothing else.
"""

from __future__ import annotations

import math

from sim.fleet import Strategy
from sim.pricing import Catalogue
from sim.spec import CHECK, CORE_PLACE, LEVELS, RESTORATION
from sim.view import Decision, ModuleView, Scope, View
from sim.workscope import PART_CAUSES, exchange_scope, margin_cycles_after, scope_of

_CAPITAL_FRAC = (
    0.105  # used only where a fleet gives no rates: discount 8.5 % and keeping 2 %, as in the settings' defaults
)


def decide(view: View, strategy: Strategy, catalogue: Catalogue, *, rate_frac: float = _CAPITAL_FRAC) -> Decision:
    """Return what to do with an engine (or the module that limits it).

    ``rate_frac``: what a year of an idle engine costs as a share of its price (discount plus keeping).
    """
    goal, stub = strategy.build_goal_cycles, strategy.stub_cycles
    swaps = _swaps(view, strategy) if strategy.way_out != "whole_engine" else ()
    if swaps and strategy.way_out == "exchange":
        return _exchange(view, swaps, catalogue, rate_frac, ())
    whole = scope_of(view, goal_cycles=goal, stub_cycles=stub, only_cause=False, catalogue=catalogue)
    if strategy.way_out == "whole_engine":
        return Decision("whole_engine", _shop(view, whole, catalogue, rate_frac), whole, (), ())
    if strategy.way_out == "exchange":
        if _worth_waiting(view, strategy):
            return Decision("wait", 0, whole, (), ())
        return Decision("whole_engine", _shop(view, whole, catalogue, rate_frac), whole, (), ())
    only = scope_of(view, goal_cycles=goal, stub_cycles=stub, only_cause=True, catalogue=catalogue)
    shop_only, shop_whole = _shop(view, only, catalogue, rate_frac), _shop(view, whole, catalogue, rate_frac)
    core = _core_visit_usd(view, whole, shop_whole, catalogue, rate_frac)
    ways = [
        ("A1", _way_usd(view, only, shop_only, catalogue, rate_frac), cycles_after(view, only)),
        ("A2", _way_usd(view, whole, shop_whole, catalogue, rate_frac), cycles_after(view, whole)),
    ]
    if swaps:
        exchange = _exchange(view, swaps, catalogue, rate_frac, ())
        usd = _exchange_usd(view, exchange, catalogue, rate_frac)
        ways.append(("B", usd, _cycles_swapped(view, dict(swaps))))
    window = max(cycles for _, _, cycles in ways)
    priced = tuple((name, usd + _later_usd(view, core, cycles, window, rate_frac)) for name, usd, cycles in ways)
    best = min(priced, key=lambda way: (way[1], way[0]))[0]
    if best == "B":
        return _exchange(view, swaps, catalogue, rate_frac, priced)
    scope, shop = (only, shop_only) if best == "A1" else (whole, shop_whole)
    return Decision("whole_engine", shop, scope, (), priced)


def cycles_after(view: View, scope: Scope) -> float:
    """Return the expected cycles to the next planned removal after a visit."""
    left = math.inf
    for module in view.modules:
        replaced = set(scope.replace[module.slot])
        for i, part in enumerate(module.parts):
            left = min(left, part.limit_cycles if i in replaced else max(0, part.left_cycles))
    return min(left, margin_cycles_after(view, list(scope.levels)))


def _cycles_swapped(view: View, swaps: dict[int, str]) -> float:
    chosen = {slot: next(m for m in view.pool if m.serial == serial) for slot, serial in swaps.items()}
    left = min(float(chosen.get(m.slot, m).least_left) for m in view.modules)
    return min(left, margin_cycles_after(view, [0] * len(view.modules), chosen))


def _swaps(view: View, strategy: Strategy) -> tuple[tuple[int, str], ...]:
    """Return the exchange that carries the engine past the stub, or nothing."""
    if view.slot >= 0:
        slots = [view.slot]
    else:  # margin: the module that has lost most, then the next
        order = sorted(view.modules, key=lambda m: (-m.lost_degC, m.slot))
        slots = [m.slot for m in order[:2]]
    chosen: list[tuple[int, str]] = []
    for slot in slots:
        module = _best_module(view, slot, strategy)
        if module is not None:
            chosen.append((slot, module.serial))
            if _cycles_swapped(view, dict(chosen)) >= strategy.stub_cycles:
                return tuple(chosen)
    return ()


def _best_module(view: View, slot: int, strategy: Strategy) -> ModuleView | None:
    shelf = [m for m in view.pool if m.slot == slot]
    if not shelf:
        return None
    if strategy.match == "first":
        return shelf[0]
    others = min((float(m.least_left) for m in view.modules if m.slot != slot), default=math.inf)
    # the shortest life that still outlasts the rest of the engine; where none does, the longest
    enough = [m for m in shelf if m.least_left >= others]
    if enough:
        return min(enough, key=lambda m: (m.least_left, m.lost_degC, m.serial))
    return min(shelf, key=lambda m: (-m.least_left, m.lost_degC, m.serial))


def _worth_waiting(view: View, strategy: Strategy) -> bool:
    if view.slot < 0 or strategy.wait_for_module_days <= 0.0:
        return False
    limit = view.day + strategy.wait_for_module_days
    return any(slot == view.slot and day <= limit for slot, day in view.coming)


def _exchange(
    view: View,
    swaps: tuple[tuple[int, str], ...],
    catalogue: Catalogue,
    rate_frac: float,
    costs: tuple[tuple[str, float], ...],
) -> Decision:
    scope = exchange_scope(view, tuple(slot for slot, _ in swaps))
    return Decision("exchange", _shop(view, scope, catalogue, rate_frac), scope, swaps, costs)


def _shop(view: View, scope: Scope, catalogue: Catalogue, rate_frac: float) -> int:
    """Return the shop with the least expected cost of work and days."""
    best, best_usd = 0, math.inf
    for number, shop in enumerate(view.shops):
        usd = _work_usd(view, scope, shop.shop, catalogue)
        usd += (_days(view, scope, number)) * _day_usd(view, catalogue, rate_frac)
        if usd < best_usd - 1e-6:
            best, best_usd = number, usd
    return best


def _days(view: View, scope: Scope, shop: int) -> float:
    seen = view.shops[shop]
    turn = seen.turn_days.get(scope.visit, 0.0)
    return seen.engine_start_day - view.day + turn + seen.transport_days


def _day_usd(view: View, catalogue: Catalogue, rate_frac: float) -> float:
    """Return what a day without the engine costs: capital while a spare is there, else rent or the aircraft itself."""
    capital = view.spec.spare_price_usd * rate_frac / 365.25
    if view.spares > view.waiting:
        return capital
    rent = catalogue.price(catalogue.number("lease_in", view.spec.engine_type, "day"))
    down = view.spec.down_usd_per_day
    return capital + (down if math.isnan(rent) else min(down, 2.0 * rent))


def _work_usd(view: View, scope: Scope, shop: str, catalogue: Catalogue) -> float:
    """Return the expected price of a visit, parts included."""
    kind = view.spec.engine_type
    number, price = catalogue.number, catalogue.price
    usd = price(number("engine_level", kind, scope.visit, shop)) + price(number("test", kind, scope.visit, shop))
    usd += 2.0 * price(number("transport", "engine", kind, shop))
    for module in view.modules:
        level = scope.levels[module.slot]
        if level:
            name = view.spec.modules[module.slot].module
            usd += price(number("work", kind, name, LEVELS[level], shop))
            usd += price(number("access", kind, name, LEVELS[level], shop))
        usd += sum(module.parts[i].price_usd for i in scope.replace[module.slot])
    return usd


def _life_bought_usd(view: View, scope: Scope) -> float:
    """Return the value of life that a visit adds: parts and restorations, less what they throw away."""
    usd = 0.0
    for module in view.modules:
        spec = view.spec.modules[module.slot]
        for i in scope.replace[module.slot]:
            part = module.parts[i]
            usd += part.price_usd * (1.0 - max(0, part.left_cycles) / max(1, part.limit_cycles))
        if scope.levels[module.slot] >= RESTORATION:
            usd += spec.restoration_usd * min(1.0, module.cycles_since_restoration / spec.interval_cycles)
    return usd


def _way_usd(view: View, scope: Scope, shop: int, catalogue: Catalogue, rate_frac: float) -> float:
    usd = _work_usd(view, scope, view.shops[shop].shop, catalogue) - _life_bought_usd(view, scope)
    return usd + _days(view, scope, shop) * _day_usd(view, catalogue, rate_frac)


def _core_visit_usd(view: View, whole: Scope, shop: int, catalogue: Catalogue, rate_frac: float) -> float:
    """Return what the next core visit costs beyond the life that it buys, whenever it comes."""
    levels = tuple(RESTORATION if slot in view.spec.core else CHECK for slot in range(len(view.spec.modules)))
    scope = Scope("core", levels, tuple(() for _ in levels))
    usd = _work_usd(view, scope, view.shops[shop].shop, catalogue)
    usd -= sum(view.spec.modules[slot].restoration_usd for slot in view.spec.core)
    turn = view.shops[shop].turn_days.get("core", 0.0) + 2.0 * view.shops[shop].transport_days
    capital = view.spec.spare_price_usd * rate_frac / 365.25
    return max(0.0, usd) + turn * capital


def _later_usd(view: View, core: float, cycles: float, window: float, rate_frac: float) -> float:
    """Return the next core visit's present cost less its share that lies beyond the common window."""
    if not math.isfinite(window) or window <= 0.0:
        return 0.0
    years = max(0.0, cycles) / view.cycles_per_year
    # a visit at n serves the time after it; inside the window it is charged for the share of a run it covers there
    share = min(1.0, (window - cycles) / max(window, 1.0))
    return float(core * share * (1.0 + rate_frac) ** -years)


def _exchange_usd(view: View, decision: Decision, catalogue: Catalogue, rate_frac: float) -> float:
    """Return the expected present cost of an exchange: the work, the days, the module's own repair, life mismatched."""
    kind, spec = view.spec.engine_type, view.spec
    number, price = catalogue.number, catalogue.price
    shop = view.shops[decision.shop].shop
    usd = 0.0
    in_shop = any(spec.modules[slot].place == CORE_PLACE for slot, _ in decision.swaps)
    if in_shop:
        usd += _work_usd(view, decision.scope, shop, catalogue)
        usd += _days(view, decision.scope, decision.shop) * _day_usd(view, catalogue, rate_frac)
    for slot, _ in decision.swaps:
        module, own = spec.modules[slot], view.modules[slot]
        usd += price(number("exchange", kind, module.module)) + 2.0 * price(number("transport", "module", kind, shop))
        level = RESTORATION if view.cause not in PART_CAUSES or view.least_level >= RESTORATION else CHECK
        work = price(number("work", kind, module.module, LEVELS[level], shop))
        if level >= RESTORATION:
            work -= module.restoration_usd * min(1.0, own.cycles_since_restoration / module.interval_cycles)
        usd += work
        if not in_shop:
            days = max(0.0, view.team_start_day - view.day) + module.exchange_days
            usd += days * _day_usd(view, catalogue, rate_frac)
        # the shelf is emptier by one module until the repair is back
        usd += module.repair.mean_days * rate_frac / 365.25 * price(number("stock", "start", kind, module.module))
    return usd
