"""From the lived past to the tables of what is where: aircraft, engines, modules and parts on the as-of date."""

from __future__ import annotations

import datetime as dt

from planner.demo.deliver import part_serial, type_of
from planner.demo.history import Histories
from planner.demo.past import Past
from planner.demo.sub_fleets import AS_OF, Tail
from planner.demo.type_tables import Row
from sim.events import KIND
from sim.state import EngineState

_LEAST_DAYS_AHEAD = 7  # a visit that should be over comes back in a week
_SPARE_BASES = {"N": ("Home", "Dune"), "W": ("Home",)}
_LEASED_IN_UNTIL, LEASED_IN_OWNER = "2026-12-31", "Evergate Pool"


def wing_places(past: Past) -> dict[str, tuple[str, int]]:
    """Return tail and position of every engine that hangs."""
    return {
        engine.serial: (aircraft.row.tail, position + 1)
        for aircraft in past.world.aircraft
        for position, engine in enumerate(aircraft.engines)
        if engine is not None
    }


def aircraft_rows(past: Past, tails: list[Tail], lived: Histories) -> list[Row]:
    """Return the tails with what they have flown."""
    rows = []
    delivered = {row["tail"]: row for row in past.delivered["aircraft"]}
    for tail in tails:
        cycles, hours = lived.tails.get(tail.tail, (0, 0.0))
        row = delivered[tail.tail] | {"rating": tail.rating, "rating_until": "", "rating_after": ""}
        row |= {"cycles_since_new": cycles, "hours_since_new": round(hours, 2)}
        if not tail.joins_later:
            row["entry_date"] = ""
        rows.append(row)
    return rows


def engine_rows(past: Past) -> list[Row]:
    """Return the engines: on the wing, spare, or in a shop with the days of the visit.

    The last spare of type N on the shelf is leased in, where there is another one.
    """
    rows, spares = [], []
    where, last = wing_places(past), _last_events(past)
    delivered = {row["engine_serial"]: row for row in past.delivered["engines"]}
    for engine in past.world.all_engines:
        if engine.serial not in delivered:
            continue  # rented in the past, and gone
        row = {
            "engine_serial": engine.serial,
            "engine_type": engine.spec.engine_type,
            "standard": delivered[engine.serial]["standard"],
            "first_run": "yes" if all(m.first_run for m in engine.modules) else "no",
            "hours_since_new": round(engine.hsn, 2),
            "cycles_since_new": engine.csn,
            "cycles_since_build": engine.csb,
        }
        if engine.serial in where:
            tail, position = where[engine.serial]
            row |= {"place": "wing", "tail": tail, "position": position}
        elif engine.serial in past.in_shops:
            row |= _visit(past, engine, last)
        else:
            row |= {"place": "spare"}
            spares.append(row)
        rows.append(row)
    _shelve(spares)
    return rows


def _shelve(spares: list[Row]) -> None:
    """Give each spare its base in turn, and lease one in."""
    for kind, bases in _SPARE_BASES.items():
        of_kind = [row for row in spares if row["engine_type"] == kind]
        for number, row in enumerate(of_kind):
            row["base"] = bases[number % len(bases)]
        if kind == "N" and len(of_kind) > 1:
            of_kind[-1] |= {"place": "leased_in", "lease_in_until": _LEASED_IN_UNTIL, "owner": LEASED_IN_OWNER}


def _visit(past: Past, engine: EngineState, last: dict[tuple[str, str], tuple[float, str, str]]) -> Row:
    """Return the days of a visit; it begins after the as-of date where the engine still queues."""
    begin, shop, visit = last["induction", engine.serial]
    removed = past.date(last["removal", engine.serial][0])
    row: Row = {"place": "shop", "shop": shop, "visit": visit, "removed_date": removed.isoformat()}
    inducted = past.date(begin)
    if inducted <= AS_OF:
        spec = next(s for s in past.world.setup.shops[engine.spec.engine_type] if s.shop == shop)
        ready = past.date(begin + spec.turn[visit].days + spec.transport_days)
        row["inducted_date"] = inducted.isoformat()
        row["ready_date"] = max(ready, AS_OF + dt.timedelta(days=_LEAST_DAYS_AHEAD)).isoformat()
    return row


def _last_events(past: Past) -> dict[tuple[str, str], tuple[float, str, str]]:
    """Return (day, other, detail) of the last removal and induction of each engine in a shop."""
    kinds = {KIND["removal"]: "removal", KIND["induction"]: "induction"}
    return {
        (kinds[row[0]], row[6]): (row[1], row[7], row[8])
        for row in past.world.log.rows
        if row[0] in kinds and row[6] in past.in_shops
    }


def module_rows(past: Past) -> list[Row]:
    """Return the modules in engines, with ages and the margin that each has lost at the rating where it flies.

    What the engine itself is better or worse than its type when new is told by its modules, each by its share.
    """
    rows = []
    rating = {e.serial: a.flying.rating for a in past.world.aircraft for e in a.engines if e is not None}
    delivered = {row["engine_serial"] for row in past.delivered["engines"]}
    for engine in past.world.all_engines:
        if engine.serial not in delivered:
            continue
        kind = engine.spec.engine_type
        at = rating.get(engine.serial, past.world.matching.default_rating(kind))
        shares = {m.module: m.wear_share for m in type_of(kind).modules}
        for module in engine.modules:
            lost = module.lost_degC(at) - engine.offset_degC * shares[module.spec.module]
            rows.append(
                {
                    "module_serial": module.serial,
                    "engine_type": kind,
                    "module": module.spec.module,
                    "engine_serial": engine.serial,
                    "standard": module.standard,
                    "hours_since_new": round(module.hsn, 2),
                    "cycles_since_new": module.csn,
                    "hours_since_restoration": round(module.hsr, 2),
                    "cycles_since_restoration": module.csr,
                    "hours_since_build": round(module.hsb, 2),
                    "cycles_since_build": module.csb,
                    "first_run": "yes" if module.first_run else "no",
                    "margin_lost_degC": round(lost, 3),
                }
            )
    return rows


def part_rows(past: Past, lived: Histories) -> list[Row]:
    """Return the parts with their cycles and hours."""
    hours: dict[str, float] = {}
    for row in lived.parts:
        hours[row["part_serial"]] = hours.get(row["part_serial"], 0.0) + row["hours"]
    delivered = {row["engine_serial"] for row in past.delivered["engines"]}
    return [
        {
            "part_serial": part_serial(part.serial),
            "part_number": part.spec.part_number,
            "module_serial": module.serial,
            "cycles_since_new": sum(part.counts(module.run)),
            "hours_since_new": round(hours.get(part_serial(part.serial), 0.0), 2),
            "status_substantiated": "yes",
            "trace_to_birth": "yes",
        }
        for engine in past.world.all_engines
        if engine.serial in delivered
        for module in engine.modules
        for part in module.parts
    ]
