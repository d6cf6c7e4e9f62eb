"""A plausible past: the fleet delivered new, flown to the as-of date by the same simulation that looks ahead.

So no part is past its limit, margins and hazards follow the same laws, and every link adds up. What is read off is the
state on the as-of date and the log of how it came about.
"""

from __future__ import annotations

import datetime as dt
import math
import tempfile
from dataclasses import replace
from pathlib import Path
from typing import Any, NamedTuple

from planner.assemble import load
from planner.demo.sub_fleets import AS_OF, Tail
from planner.demo.type_tables import Row
from planner.demo.types import DEMO_TYPES
from planner.demo.write import write_tables
from sim.setting_out import begun_scope, set_out
from sim.spec import setup
from sim.start import names
from sim.state import EngineState, ModuleState, PartState
from sim.world import World

_CODES = {
    "fan-booster": "FB",
    "fan": "FN",
    "booster": "BO",
    "HPC": "HC",
    "combustor": "CB",
    "HPT": "HT",
    "LPT": "LT",
    "gearbox": "GB",
}
SPARE_ENGINES = {"N": 5, "W": 3}
READY_SPARES = {"N": 3, "W": 2}  # of them on the shelf on the as-of date; the rest are in shops
SPARE_MODULES = {"N": ("fan-booster", "LPT", "LPT", "HPT", "gearbox"), "W": ("fan", "LPT", "gearbox")}
_MODIFIED_FROM = dt.date(2018, 1, 1)  # deliveries from here on carry the modified HPT and the new LPT
_RATING_CHANGE = dt.date(2022, 4, 1)


class Past(NamedTuple):
    """The world on the as-of date, its first day, and what was delivered."""

    world: World
    start: dt.date
    delivered: dict[str, list[Row]]
    changed_rating: tuple[str, ...]


def live(tails: list[Tail], tables: dict[str, list[Row]], *, scale: float, seed: int) -> Past:
    """Fly a new fleet up to the as-of date and return where it stands."""
    start = min(tail.entry for tail in tails) - dt.timedelta(days=1)
    delivered = _deliver(tails, scale=scale)
    changed = _earlier_ratings(tails)
    for row in delivered["aircraft"]:
        if row["tail"] in changed:
            row |= {"rating": "high", "rating_until": _RATING_CHANGE.isoformat(), "rating_after": "mid"}
    settings = [row for row in tables["settings"] if row["name"] not in ("as_of", "price_date", "horizon_years")]
    settings += [{"name": "as_of", "value": start.isoformat()}, {"name": "horizon_years", "value": 20}]
    with tempfile.TemporaryDirectory() as folder:
        write_tables(Path(folder), {**tables, **delivered, "settings": settings})
        fleet = load(Path(folder))
    days = float((AS_OF - start).days)
    ready = setup(fleet, "whole_engine", horizon_days=days)
    world = World(ready, names(ready), seed=seed, run=0)
    set_out(world)
    for aircraft in world.aircraft:
        world.env.process(aircraft.life())
    world.env.run(until=days)
    for aircraft in world.aircraft:
        aircraft.book_now()
    _fill_the_gaps(world)
    for kind, count in READY_SPARES.items():
        if kind in world.engine_pools:
            _stock_the_shelf(world, kind, max(1, round(count * scale)))
    return Past(world, start, delivered, changed)


def _earlier_ratings(tails: list[Tail]) -> tuple[str, ...]:
    """Return the two oldest tails of NA now at mid: they flew at high before."""
    found = [t for t in tails if t.sub_fleet.code == "NA" and t.rating == "mid" and t.entry < _RATING_CHANGE]
    return tuple(t.tail for t in sorted(found, key=lambda t: t.entry)[:2])


def _deliver(tails: list[Tail], *, scale: float) -> dict[str, list[Row]]:
    """Return aircraft, engines, modules and parts as they were delivered new."""
    tables: dict[str, list[Row]] = {"aircraft": [], "engines": [], "modules": [], "parts": []}
    counters: dict[str, int] = {}
    for tail in tails:
        sub = tail.sub_fleet
        tables["aircraft"].append(
            {
                "tail": tail.tail,
                "sub_fleet": sub.code,
                "engine_type": sub.engine_type,
                "rating": tail.rating,
                "positions": 2,
                "base": sub.base,
                "hours_per_year": sub.hours,
                "cycles_per_year": sub.cycles,
                "average_derate_frac": sub.derate,
                "etops_minutes": sub.etops,
                "entry_date": tail.entry.isoformat(),
            }
        )
        for position in (1, 2):
            place = {"place": "wing", "tail": tail.tail, "position": position}
            _engine(tables, counters, sub.engine_type, tail.entry, place)
    kinds = {tail.sub_fleet.engine_type for tail in tails}
    first = min(tail.entry for tail in tails)
    for kind in sorted(kinds):
        for number in range(max(1, round(SPARE_ENGINES[kind] * scale))):
            entry = first + dt.timedelta(days=365 * (1 + 2 * (number % 5)))
            _engine(tables, counters, kind, entry, {"place": "spare", "base": "Home"})
        for name in SPARE_MODULES[kind] * max(1, round(scale)):
            standard = {"HPT": "pre", "LPT": "old"}.get(name, "") if kind == "N" else ""
            _module(tables, counters, kind, name, standard, {"place": "pool", "base": "Home"})
    return tables


def _next(counters: dict[str, int], key: str) -> int:
    counters[key] = counters.get(key, 0) + 1
    return counters[key]


def _engine(tables: dict[str, list[Row]], counters: dict[str, int], kind: str, entry: dt.date, place: Row) -> None:
    serial = f"{kind}E{1000 + _next(counters, kind)}"
    modified = entry >= _MODIFIED_FROM
    tables["engines"].append(
        {"engine_serial": serial, "engine_type": kind, "first_run": "yes", "standard": "B" if modified else "A"} | place
    )
    for module in next(t for t in DEMO_TYPES if t.row["engine_type"] == kind).modules:
        standard = ""
        if kind == "N" and module.module in ("HPT", "LPT"):
            standard = {"HPT": "post" if modified else "pre", "LPT": "new" if modified else "old"}[module.module]
        _module(tables, counters, kind, module.module, standard, {"engine_serial": serial})


def _module(
    tables: dict[str, list[Row]], counters: dict[str, int], kind: str, name: str, standard: str, place: Row
) -> None:
    code = f"{kind}{_CODES[name]}"
    serial = f"{code}{10000 + _next(counters, code)}"
    tables["modules"].append(
        {"module_serial": serial, "engine_type": kind, "module": name, "standard": standard, "first_run": "yes"} | place
    )
    for number, module, *_ in next(t for t in DEMO_TYPES if t.row["engine_type"] == kind).parts:
        if module == name:
            part = f"{number.replace('-', '')}-{100000 + _next(counters, number)}"
            tables["parts"].append(
                {
                    "part_serial": part,
                    "part_number": number,
                    "module_serial": serial,
                    "cycles_since_new": 0,
                    "hours_since_new": 0,
                    "status_substantiated": "yes",
                    "trace_to_birth": "yes",
                }
            )


def part_serial(serial: str) -> str:
    """Return the serial of a part that the simulation has named ``first~count``: its number moves on."""
    root, _, count = serial.partition("~")
    if not count:
        return root
    stem, _, number = root.rpartition("-")
    return f"{stem}-{int(number) + 100000 * int(count)}"


def _fill_the_gaps(world: World) -> None:
    """Hang an own engine wherever a tail stands without one (or with a rented one) on the as-of date."""
    for aircraft in world.aircraft:
        for position, engine in enumerate(aircraft.engines):
            if engine is not None and not engine.leased:
                continue
            found = _best_spare(world, aircraft.row.engine_type, aircraft.flying.rating)
            if found is not None:
                aircraft.engines[position] = found
                world.matching.flew_on(found, aircraft.flying)


def _best_spare(world: World, kind: str, rating: int) -> EngineState | None:
    """Return a spare from the shelf, else the engine whose visit has begun, with its work done; the best margin
    wins."""
    pool = world.engine_pools[kind].engines
    begun = [e for e in world.all_engines if e.spec.engine_type == kind and e.serial in world.under_way]
    begun = [e for e in begun if world.under_way[e.serial][0] <= world.env.now]
    if pool:
        engine = max(pool, key=lambda e: (e.margin_degC(rating), e.serial))
        pool.remove(engine)
        return engine
    if begun:
        engine = min(begun, key=lambda e: (world.under_way[e.serial][0], e.serial))
        world.under_way.pop(engine.serial)[1]()
        return engine
    return _hurried(world, kind)


def _hurried(world: World, kind: str) -> EngineState | None:
    """Return an engine that still queues, given a core visit in a hurry: the past ends with no tail on the ground."""
    hung = {e.serial for a in world.aircraft for e in a.engines if e is not None}
    queued = [e for e in world.all_engines if e.spec.engine_type == kind and e.serial not in hung and e.modules]
    if not queued:
        return None
    engine = min(queued, key=lambda e: e.serial)
    world.under_way.pop(engine.serial, None)
    row = next(e for e in world.setup.fleet.engines if e.engine_serial == engine.serial)
    world.bench.work_on(engine, begun_scope(world, replace(row, visit="core"), engine), day=world.env.now)
    return engine


def _stock_the_shelf(world: World, kind: str, count: int) -> None:
    """End visits early until so many spares are ready, as far as there are engines off the wing."""
    pool = world.engine_pools[kind].engines
    while len(pool) < count:
        hung = {e.serial for a in world.aircraft for e in a.engines if e is not None}
        ready = {e.serial for e in pool}
        begun = [e for e in world.all_engines if e.spec.engine_type == kind and e.serial not in hung | ready]
        if not begun:
            return
        engine = min(begun, key=lambda e: (world.under_way.get(e.serial, (math.inf, None))[0], e.serial))
        work = world.under_way.pop(engine.serial, None)
        if work is not None:
            work[1]()
        else:
            row = next(e for e in world.setup.fleet.engines if e.engine_serial == engine.serial)
            world.bench.work_on(engine, begun_scope(world, replace(row, visit="core"), engine), day=world.env.now)
        pool.append(engine)


def margin_lost(module: ModuleState, rating: int) -> float:
    return round(module.lost_degC(rating), 3)


def parts_of(world: World) -> list[tuple[ModuleState, PartState]]:
    """Return every part with the module that it is in."""
    return [(module, part) for module in world.all_modules for part in module.parts]


def rows_named(rows: list[Row], key: str) -> dict[Any, Row]:
    return {row[key]: row for row in rows}
