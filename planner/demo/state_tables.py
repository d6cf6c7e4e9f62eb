"""From the lived past to the tables of what is where: aircraft, engines, modules, parts and their histories."""

from __future__ import annotations

import datetime as dt
from typing import NamedTuple

from planner.demo.luck import uniform
from planner.demo.past import Past, margin_lost, part_serial, rows_named
from planner.demo.sub_fleets import AS_OF, Tail
from planner.demo.type_tables import Row
from sim.events import KIND
from sim.removal import slope
from sim.state import EngineState, ModuleState

_KEEP = ("install", "removal", "flown", "part_off", "part_on", "induction", "entry", "work")


class Places(NamedTuple):
    """Where engines hang: engine serial to (tail, position)."""

    engine: dict[str, tuple[str, int]]


def places(past: Past) -> Places:
    found = {}
    for aircraft in past.world.aircraft:
        for position, engine in enumerate(aircraft.engines):
            if engine is not None:
                found[engine.serial] = (aircraft.row.tail, position + 1)
    return Places(found)


def aircraft_rows(past: Past, tails: list[Tail], histories: dict[str, tuple[int, float]]) -> list[Row]:
    """Return the tails with what they have flown."""
    rows = []
    delivered = rows_named(past.delivered["aircraft"], "tail")
    for tail in tails:
        cycles, hours = histories.get(tail.tail, (0, 0.0))
        row = dict(delivered[tail.tail])
        row |= {"rating": tail.rating, "rating_until": "", "rating_after": ""}
        if tail.entry <= AS_OF:
            row["entry_date"] = ""
        row |= {"cycles_since_new": cycles, "hours_since_new": round(hours, 2)}
        rows.append(row)
    return rows


def engine_rows(past: Past, where: Places) -> list[Row]:
    """Return the engines: on the wing, spare, or in a shop with the days of the visit."""
    world, rows = past.world, []
    delivered = rows_named(past.delivered["engines"], "engine_serial")
    last = _last_facts(past)
    for engine in world.all_engines:
        row = {
            "engine_serial": engine.serial,
            "engine_type": engine.spec.engine_type,
            "standard": delivered[engine.serial]["standard"],
            "first_run": "yes" if all(m.first_run for m in engine.modules) else "no",
            "hours_since_new": round(engine.hsn, 2),
            "cycles_since_new": engine.csn,
            "cycles_since_build": engine.csb,
        }
        if engine.serial in where.engine:
            tail, position = where.engine[engine.serial]
            row |= {"place": "wing", "tail": tail, "position": position}
        elif engine.serial in world.under_way or _comes_back(past, engine, last):
            row |= _visit(past, engine, last)
        else:
            row |= {"place": "spare", "base": "Dune" if uniform(1, "base", engine.serial) < 0.3 else "Home"}
        rows.append(row)
    return rows


def _comes_back(past: Past, engine: EngineState, last: dict[str, dict[str, tuple[float, str, str]]]) -> bool:
    """Return whether an engine off the wing is on its way to, in, or from a shop."""
    return engine not in past.world.engine_pools[engine.spec.engine_type].engines and "induction" in last.get(
        engine.serial, {}
    )


def _last_facts(past: Past) -> dict[str, dict[str, tuple[float, str, str]]]:
    """Return, by engine, the last removal and induction: (day, other, detail)."""
    kinds = {KIND["removal"]: "removal", KIND["induction"]: "induction"}
    found: dict[str, dict[str, tuple[float, str, str]]] = {}
    for row in past.world.log.rows:
        if row[0] in kinds:
            found.setdefault(row[6], {})[kinds[row[0]]] = (row[1], row[7], row[8])
    return found


def date_of(past: Past, day: float) -> dt.date:
    return past.start + dt.timedelta(days=int(day))


def _visit(past: Past, engine: EngineState, last: dict[str, dict[str, tuple[float, str, str]]]) -> Row:
    inducted, shop, visit = last[engine.serial]["induction"]
    removed = last[engine.serial]["removal"][0]
    specs = past.world.setup.shops[engine.spec.engine_type]
    spec = next(s for s in specs if s.shop == shop)
    row: Row = {"place": "shop", "shop": shop, "visit": visit, "removed_date": date_of(past, removed).isoformat()}
    ready = date_of(past, inducted + spec.turn[visit].days + spec.transport_days)
    if date_of(past, inducted) <= AS_OF:
        row["inducted_date"] = date_of(past, inducted).isoformat()
        row["ready_date"] = max(ready, AS_OF + dt.timedelta(days=7)).isoformat()
    return row


def module_rows(past: Past, where: Places) -> list[Row]:
    """Return the modules with ages and the margin that each has lost at the rating where it flies."""
    world, rows = past.world, []
    rating = {a.row.tail: a.flying.rating for a in world.aircraft}
    home = {m.serial: engine for engine in world.all_engines for m in engine.modules}
    for module in world.all_modules:
        engine = home.get(module.serial)
        tail = where.engine.get(engine.serial, ("", 0))[0] if engine else ""
        at = rating[tail] if tail else world.matching.default_rating(module.spec.engine_type)
        row = {
            "module_serial": module.serial,
            "engine_type": module.spec.engine_type,
            "module": module.spec.module,
            "standard": module.standard,
            "hours_since_new": round(module.hsn, 2),
            "cycles_since_new": module.csn,
            "hours_since_restoration": round(module.hsr, 2),
            "cycles_since_restoration": module.csr,
            "hours_since_build": round(module.hsb, 2),
            "cycles_since_build": module.csb,
            "first_run": "yes" if module.first_run else "no",
            "margin_lost_degC": round(margin_lost(module, at) - _build_luck(engine, module), 3),
        }
        row |= {"engine_serial": engine.serial} if engine else {"place": "pool", "base": "Home"}
        rows.append(row)
    return rows


def _build_luck(engine: EngineState | None, module: ModuleState) -> float:
    """Return what the last build was better than the type's margin; the records book it on the HPT."""
    return engine.offset_degC if engine is not None and module.spec.module == "HPT" else 0.0


def margin_rows(past: Past, where: Places, seed: int) -> list[Row]:
    """Return readings of the margin of the engines on the wing, back from today's state along the wear law."""
    rows = []
    for aircraft in past.world.aircraft:
        for engine in aircraft.engines:
            if engine is None or engine.since_cycles < 60 or not engine.modules:
                continue
            rows += _readings(past, engine, aircraft.flying, aircraft.cycles_per_year, seed)
    return rows


def _readings(past: Past, engine: EngineState, flying, cycles_per_year: float, seed: int) -> list[Row]:  # type: ignore[no-untyped-def]
    world = past.world
    sigma = world.engine_rows[engine.spec.engine_type].reading_noise_degC
    span = min(engine.since_cycles, round(2.5 * cycles_per_year))
    count = max(4, min(30, span // max(1, round(cycles_per_year / 12))))
    today = world.season.flown(world.env.now)
    rows = []
    for number in range(count):
        back = round(span * (1.0 - (number + 0.5) / count))
        at = engine.since_cycles - back
        lost = _lost_then(engine, flying, back)
        gain = _wash_then(engine, flying, back)
        u, v = uniform(seed, "noise", engine.serial, number), uniform(seed, "outlier", engine.serial, number)
        noise = sigma * _normal(u) * (4.0 if v < 0.02 else 1.0)
        day = world.season.day(today - back / cycles_per_year)
        rows.append(
            {
                "engine_serial": engine.serial,
                "date": date_of(past, day).isoformat(),
                "cycles_since_install": at,
                "margin_degC": round(engine.margin_degC(flying.rating) + lost + gain + noise, 1),
                "event": "",
            }
        )
    return rows


def _normal(u: float) -> float:
    from sim.draws import normal

    return normal(u)


def _lost_then(engine: EngineState, flying, back: int) -> float:  # type: ignore[no-untyped-def]
    """Return how much more margin the engine had ``back`` cycles ago."""
    from sim.wear import gained

    total = 0.0
    for module in engine.modules:
        law = module.spec.wear[flying.rating]
        since = max(0, module.csr - back)
        factor = flying.wear_factor * module.factor
        total += factor * law.unit_degC * gained(law, since, module.csr - since, flying.hours_per_cycle)
    return total


def _wash_then(engine: EngineState, flying, back: int) -> float:  # type: ignore[no-untyped-def]
    from sim.wear import wash_gain

    if flying.wash is None:
        return 0.0
    gain, half_life, every, _ = flying.wash
    return wash_gain(gain_degC=gain, half_life=half_life, every=every, since=max(0, engine.csb - back))


__all__ = ["ModuleState", "part_serial", "slope"]
