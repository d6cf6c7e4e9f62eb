"""What a visit does: a level for each module with the access closure, the parts to replace, and the kind of visit.

Rules (common practice, no source, each a column of the user's tables): what is exposed is inspected; an opened module
past half of its expected interval that would not last to the build goal is restored; parts in an opened module that
would not reach the goal are replaced; a module that a part would stop within the stub is opened too; margin is bought
back where a degree costs least until the engine is expected to reach the goal.
"""

from __future__ import annotations

import math

from sim.pricing import Catalogue
from sim.spec import CHECK, LEVELS, NONE, RESTORATION, TypeSpec
from sim.view import ModuleView, Scope, View
from sim.wear import Slope, cycles_to

PART_CAUSES = ("limit", "directive", "unknown_life")


def scope_of(view: View, *, goal_cycles: int, stub_cycles: int, only_cause: bool, catalogue: Catalogue) -> Scope:
    """Return the work on an engine that goes to a shop whole.

    ``only_cause``: nothing but the cause and what must be opened for it (way A1); else built for the goal (way A2).
    """
    spec = view.spec
    levels = [NONE] * len(spec.modules)
    if view.slot >= 0:
        levels[view.slot] = max(CHECK, view.least_level)
    if not only_cause:
        for module in view.modules:
            if module.least_left < stub_cycles:
                levels[module.slot] = max(levels[module.slot], CHECK)
    _expose(spec, levels)
    if view.cause == "margin":
        _buy_margin(view, levels, goal_cycles=stub_cycles if only_cause else goal_cycles, catalogue=catalogue)
    if not only_cause:
        _restore_the_worn(view, levels, goal_cycles)
        if _opens_core(spec, levels):
            _buy_margin(view, levels, goal_cycles=goal_cycles, catalogue=catalogue)
    reach = stub_cycles if only_cause else goal_cycles
    replace = tuple(_short_parts(module, reach) if levels[module.slot] else () for module in view.modules)
    return Scope(_visit(spec, levels), tuple(levels), replace)


def exchange_scope(view: View, slots: tuple[int, ...]) -> Scope:
    """Return the work on an engine whose modules in ``slots`` are exchanged in a shop: what is exposed is checked."""
    levels = [NONE] * len(view.spec.modules)
    for slot in slots:
        for other in view.spec.modules[slot].behind:
            if other not in slots:
                levels[other] = CHECK
    return Scope("module_exchange", tuple(levels), tuple(() for _ in levels))


def repair_level(module: ModuleView, spec: TypeSpec, *, cause: str, least_level: int) -> int:
    """Return the level for a module that comes off by exchange."""
    interval = spec.modules[module.slot].interval_cycles
    if cause in PART_CAUSES and module.cycles_since_restoration < interval / 2.0:
        return max(CHECK, least_level)
    return max(RESTORATION, least_level)


def _expose(spec: TypeSpec, levels: list[int]) -> None:
    for slot, level in enumerate(list(levels)):
        if level:
            for other in spec.modules[slot].behind:
                levels[other] = max(levels[other], CHECK)


def _opens_core(spec: TypeSpec, levels: list[int]) -> bool:
    return any(levels[slot] for slot in spec.core)


def _restore_the_worn(view: View, levels: list[int], goal_cycles: int) -> None:
    for module in view.modules:
        interval = view.spec.modules[module.slot].interval_cycles
        since = module.cycles_since_restoration
        hours = view.spec.modules[module.slot].interval_hours
        worn = max(since / interval, module.hours_since_restoration / hours)
        if levels[module.slot] and worn > 0.5 and worn + goal_cycles / interval > 1.0:
            levels[module.slot] = max(levels[module.slot], RESTORATION)


def margin_after(view: View, levels: list[int]) -> float:
    """Return the margin above the removal threshold after that work, as expected."""
    return view.margin_degC - view.spec.removal_margin + sum(_gain(view, m, levels[m.slot]) for m in view.modules)


def _gain(view: View, module: ModuleView, level: int) -> float:
    """Return the degrees that a level gives back: its share of what can be restored; a first restoration leaves the
    part that never comes back."""
    if level < RESTORATION:
        return 0.0
    spec = view.spec.modules[module.slot]
    law = spec.wear[view.rating]
    stays = law.unrecoverable * law.unit_degC if module.first_run else module.permanent_degC
    return spec.restores[level] * max(0.0, module.lost_degC - stays)


def margin_cycles_after(view: View, levels: list[int], swapped: dict[int, ModuleView] | None = None) -> float:
    """Return the cycles to the removal threshold after work and exchanges, along the expected wear."""
    early: dict[float, float] = {}
    steady = 0.0
    margin = margin_after(view, levels)
    for own in view.modules:
        module = own
        if swapped and own.slot in swapped:
            module = swapped[own.slot]
            margin += own.lost_degC - module.lost_degC
        law = view.spec.modules[own.slot].wear[view.rating]
        since = 0 if levels[own.slot] >= RESTORATION else module.cycles_since_restoration
        factor = view.wear_factor * law.unit_degC
        steady += factor * (law.per_cycle + law.per_hour * view.hours_per_cycle)
        if law.early:
            tau = law.scale_cycles
            early[tau] = early.get(tau, 0.0) + factor * law.early * math.exp(-since / tau)
    return cycles_to(Slope(tuple((amount, tau) for tau, amount in early.items()), steady), margin)


def _buy_margin(view: View, levels: list[int], *, goal_cycles: int, catalogue: Catalogue) -> None:
    """Restore modules, the cheapest degree first, until the goal is expected to be reached or nothing is left."""
    spec = view.spec
    shop = view.shops[0].shop if view.shops else ""
    for _ in spec.modules:
        if margin_cycles_after(view, levels) >= goal_cycles:
            return
        best, best_price = -1, math.inf
        for module in view.modules:
            slot = module.slot
            gain = _gain(view, module, RESTORATION)
            if levels[slot] >= RESTORATION or gain <= 0.2:
                continue
            price = catalogue.price(
                catalogue.number("work", spec.engine_type, spec.modules[slot].module, "restoration", shop)
            )
            opened = {slot, *spec.modules[slot].behind}
            price += sum(
                catalogue.price(catalogue.number("work", spec.engine_type, spec.modules[i].module, "check", shop))
                for i in opened
                if not levels[i]
            )
            if price / gain < best_price:
                best, best_price = slot, price / gain
        if best < 0:
            return
        levels[best] = RESTORATION
        _expose(spec, levels)


def _short_parts(module: ModuleView, reach_cycles: int) -> tuple[int, ...]:
    return tuple(i for i, part in enumerate(module.parts) if part.left_cycles < min(reach_cycles, part.limit_cycles))


def _visit(spec: TypeSpec, levels: list[int]) -> str:
    restored = sum(level >= RESTORATION for level in levels)
    if restored >= max(2, len(levels) - 1):
        return "overhaul"
    return "core" if _opens_core(spec, levels) else "quick"


def level_name(level: int) -> str:
    return LEVELS[level]
