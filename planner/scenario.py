"""What-ifs: a fleet with other stock, prices, turn times or build goals, as a new value; no fleet is changed."""

from __future__ import annotations

from collections import Counter
from dataclasses import dataclass, replace
from typing import TypeVar

from sim.errors import RequestError
from sim.fleet import Engine, Fleet, Holding, Module, Part, Strategy
from sim.wear import Slope, cycles_to

Spare = TypeVar("Spare", Engine, Module)


@dataclass(frozen=True, slots=True, kw_only=True)
class WhatIf:
    """Changes against the records; None leaves a thing as it is.

    ``stock``: spares held of a type and item (``engine`` or a module's name), in place of what is held.
    ``turn_time_factor`` scales every turn time in shops.
    """

    stock: tuple[Holding, ...] = ()
    build_goal_cycles: int | None = None
    turn_time_factor: float = 1.0
    fuel_price_usd_per_kg: float | None = None
    horizon_years: float | None = None


def apply(fleet: Fleet, what_if: WhatIf) -> Fleet:
    """Return the fleet as the what-if has it. Raises RequestError for values that cannot be."""
    settings = fleet.settings
    if what_if.fuel_price_usd_per_kg is not None:
        _at_least("fuel price", what_if.fuel_price_usd_per_kg, 0.0)
        settings = replace(settings, fuel_price_usd_per_kg=what_if.fuel_price_usd_per_kg)
    if what_if.horizon_years is not None:
        if not 0.0 < what_if.horizon_years <= 40.0:
            raise RequestError("horizon", f"{what_if.horizon_years:g} years", "more than 0 and at most 40 years")
        settings = replace(settings, horizon_years=what_if.horizon_years)
    fleet = replace(fleet, settings=settings)
    if what_if.turn_time_factor != 1.0:
        _at_least("turn-time factor", what_if.turn_time_factor, 0.01)
        fleet = _turn_times(fleet, what_if.turn_time_factor)
    if what_if.build_goal_cycles is not None:
        _at_least("build goal", what_if.build_goal_cycles, 1)
        goal = what_if.build_goal_cycles
        fleet = replace(fleet, strategies=tuple(replace(s, build_goal_cycles=goal) for s in fleet.strategies))
    return with_stock(fleet, what_if.stock or fleet.holdings)


def _at_least(what: str, value: float, least: float) -> None:
    if not value >= least:
        raise RequestError(what, f"{value:g}", f"at least {least:g}")


def _turn_times(fleet: Fleet, factor: float) -> Fleet:
    return replace(
        fleet,
        shop_work=tuple(
            replace(w, days_median=w.days_median * factor, days_p90=None if w.days_p90 is None else w.days_p90 * factor)
            for w in fleet.shop_work
        ),
        module_types=tuple(
            replace(
                m,
                repair_days_median=m.repair_days_median * factor,
                repair_days_p90=m.repair_days_p90 * factor,
            )
            for m in fleet.module_types
        ),
    )


def stock_held(fleet: Fleet) -> dict[tuple[str, str], int]:
    """Return how many spares are held by (type, item): owned engines off the wing, modules in no engine."""
    counts: Counter[tuple[str, str]] = Counter()
    for kind in fleet.engine_types:
        counts[kind.engine_type, "engine"] = 0
    for engine in fleet.engines:
        counts[engine.engine_type, "engine"] += engine.place in ("spare", "shop")
    for module in fleet.modules:
        if not module.engine_serial:
            counts[module.engine_type, module.module] += 1
    return dict(counts)


def with_stock(fleet: Fleet, stock: tuple[Holding, ...]) -> Fleet:
    """Return the fleet with so many spares of each item named; items that are not named stay as they are.

    Spares are taken away from the shelf first, then from shops, the last serial first; what is added is at half
    of its life (parts at half of their limits, modules at half of their intervals or of the run that the margin
    allows, if that is shorter), so that stock is neither new nor worn out.
    """
    wanted: dict[tuple[str, str], int] = {}
    for row in stock:
        check_item(fleet, row)
        key = (row.engine_type, row.module)
        wanted[key] = wanted.get(key, 0) + row.count  # bases add up
    for (kind, item), count in sorted(wanted.items()):
        held = stock_held(fleet).get((kind, item), 0)
        if count < held:
            fleet = _take_away(fleet, kind, item, held - count)
        for number in range(count - held):
            fleet = _add_engine(fleet, kind, number) if item == "engine" else _add_module(fleet, kind, item, number)
    return fleet


def check_item(fleet: Fleet, row: Holding) -> None:
    """Raise RequestError for a type or item that the fleet does not have, or a count below zero."""
    kinds = [t.engine_type for t in fleet.engine_types]
    if row.engine_type not in kinds:
        raise RequestError("holding", row.engine_type, f"an engine type: {', '.join(kinds)}")
    items = ["engine", *(m.module for m in fleet.module_types if m.engine_type == row.engine_type)]
    if row.module not in items:
        raise RequestError("holding", row.module, f"an item of type {row.engine_type}: {', '.join(items)}")
    if row.count < 0:
        raise RequestError("holding", str(row.count), "0 or more")


def _take_away(fleet: Fleet, kind: str, item: str, count: int) -> Fleet:
    if item != "engine":
        loose = [m for m in fleet.modules if m.engine_type == kind and m.module == item and not m.engine_serial]
        gone = {m.module_serial for m in _last_first(sorted(loose, key=lambda m: m.module_serial), count)}
        return _without_modules(fleet, gone)
    spares = [e for e in fleet.engines if e.engine_type == kind and e.place in ("spare", "shop")]
    spares.sort(key=lambda e: e.engine_serial)
    serials = {e.engine_serial for e in _last_first(spares, count)}
    gone = {m.module_serial for m in fleet.modules if m.engine_serial in serials}
    fleet = replace(fleet, engines=tuple(e for e in fleet.engines if e.engine_serial not in serials))
    return _without_modules(fleet, gone)


def _last_first(rows: list[Spare], count: int) -> list[Spare]:
    """Return the rows to take away: those on the shelf before those in shops, the last serial first."""
    last_first = rows[::-1]
    return sorted(last_first, key=lambda row: row.place == "shop")[:count]


def _without_modules(fleet: Fleet, gone: set[str]) -> Fleet:
    return replace(
        fleet,
        modules=tuple(m for m in fleet.modules if m.module_serial not in gone),
        parts=tuple(p for p in fleet.parts if p.module_serial not in gone),
    )


def _add_engine(fleet: Fleet, kind: str, number: int) -> Fleet:
    serial = _free_serial({e.engine_serial for e in fleet.engines}, f"whatif-{kind}-engine", number)
    engine = Engine(engine_serial=serial, engine_type=kind, place="spare")
    fleet = replace(fleet, engines=(*fleet.engines, engine))
    for module in fleet.module_types:
        if module.engine_type == kind:
            fleet = _add_module(fleet, kind, module.module, number, engine_serial=serial)
    return fleet


def _add_module(fleet: Fleet, kind: str, name: str, number: int, engine_serial: str = "") -> Fleet:
    serial = _free_serial({m.module_serial for m in fleet.modules}, f"whatif-{kind}-{name}", number)
    standards = Counter(m.standard for m in fleet.modules if m.engine_type == kind and m.module == name)
    interval = next(
        (
            w.expected_interval_cycles or 0
            for w in fleet.work
            if (w.engine_type, w.module, w.level) == (kind, name, "restoration")
        ),
        0,
    )
    half = int(min(float(interval), _margin_run_cycles(fleet, kind))) // 2
    hours_per_cycle = _hours_per_cycle(fleet, kind)
    rating = _common_rating(fleet, kind)
    module = Module(
        module_serial=serial,
        engine_type=kind,
        module=name,
        engine_serial=engine_serial,
        place="" if engine_serial else "pool",
        standard=min(standards, key=lambda s: (-standards[s], s)) if standards else "",
        cycles_since_new=half,
        cycles_since_restoration=half,
        cycles_since_build=half,
        hours_since_new=half * hours_per_cycle,
        hours_since_restoration=half * hours_per_cycle,
        hours_since_build=half * hours_per_cycle,
    )
    parts = []
    for part in fleet.part_types:
        if (part.engine_type, part.module) != (kind, name):
            continue
        limits = [
            x.limit_cycles
            for x in fleet.part_limits
            if x.part_number == part.part_number and x.rating == rating and not x.directive
        ]
        used = min(limits, default=0) // 2
        parts.append(
            Part(
                part_serial=f"{serial}/{part.part_number}",
                part_number=part.part_number,
                module_serial=serial,
                cycles_since_new=used,
                hours_since_new=used * hours_per_cycle,
                made_day=0.0,
                flown=((rating, used),),
            )
        )
    return replace(fleet, modules=(*fleet.modules, module), parts=(*fleet.parts, *parts))


def _margin_run_cycles(fleet: Fleet, kind: str) -> float:
    """Return the cycles from a restoration to the removal threshold at the rating and on the bases that a type flies
    (inf where wear is not given)."""
    row = next(t for t in fleet.engine_types if t.engine_type == kind)
    rating = _common_rating(fleet, kind)
    new = next(r.new_margin_degC for r in fleet.ratings if (r.engine_type, r.rating) == (kind, rating))
    wear = [w for w in fleet.wear if (w.engine_type, w.rating) == (kind, rating)]
    bases = {b.base: b.environment for b in fleet.bases}
    flown = [bases.get(a.base, 1.0) for a in fleet.aircraft if a.engine_type == kind]
    environment = sum(flown) / len(flown) if flown else 1.0
    hours = _hours_per_cycle(fleet, kind)
    steady = sum(w.loss_degC_per_1000_cycles + w.loss_degC_per_1000_hours * hours for w in wear) / 1000.0
    early = tuple((environment * w.early_loss_degC, w.early_scale_cycles) for w in wear)
    left = new - row.removal_margin_degC - sum(w.unrecoverable_degC for w in wear)
    return cycles_to(Slope(early, environment * steady), left)


def _free_serial(taken: set[str], stem: str, number: int) -> str:
    while f"{stem}-{number + 1}" in taken:
        number += 1
    return f"{stem}-{number + 1}"


def _hours_per_cycle(fleet: Fleet, kind: str) -> float:
    rows = [a for a in fleet.aircraft if a.engine_type == kind]
    cycles = sum(a.cycles_per_year for a in rows)
    return sum(a.hours_per_year for a in rows) / cycles if cycles else 1.0


def _common_rating(fleet: Fleet, kind: str) -> str:
    counts = Counter(a.rating for a in fleet.aircraft if a.engine_type == kind)
    ratings = [r.rating for r in fleet.ratings if r.engine_type == kind]
    return min(counts, key=lambda r: (-counts[r], r)) if counts else ratings[0]


def same_money(fleet: Fleet, strategy: Strategy) -> tuple[Holding, ...]:
    """Return the stock of a strategy when both ways of working may spend what is invested in spares today.

    Who exchanges keeps today's stock. Who removes whole engines has no use for modules on a shelf: their price (with
    the parts in them) buys spare engines, whole ones only, so never more than the same money.
    """
    if strategy.way_out != "whole_engine":
        return ()
    held = stock_held(fleet)
    result = []
    for kind in fleet.engine_types:
        name = kind.engine_type
        modules = [m for m in fleet.module_types if m.engine_type == name]
        prices = {
            m.module: m.spare_price_usd
            + sum(p.price_usd for p in fleet.part_types if (p.engine_type, p.module) == (name, m.module))
            for m in modules
        }
        money = sum(prices[m.module] * held.get((name, m.module), 0) for m in modules)
        result.append(
            Holding(
                engine_type=name,
                module="engine",
                count=held[name, "engine"] + int(money // kind.spare_price_usd),
            )
        )
        result += [Holding(engine_type=name, module=m.module, count=0) for m in modules]
    return tuple(result)
