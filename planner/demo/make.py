"""Making the demo: types as data, a lived past, contracts, and (unless plain) the planted complications."""

from __future__ import annotations

import shutil
from pathlib import Path

from planner.demo.contracts import delivery_rows, lease_tables, owners
from planner.demo.dirty import dirty_tables
from planner.demo.history import Histories, histories
from planner.demo.past import Past, live, part_serial
from planner.demo.planted import plant, smooth
from planner.demo.state_tables import aircraft_rows, engine_rows, margin_rows, module_rows, places
from planner.demo.sub_fleets import SUB_FLEETS, tails
from planner.demo.type_tables import Row, settings, type_tables
from planner.demo.write import move_into_place, new_folder, write_tables

DEFAULT_AIRCRAFT = 40
DEFAULT_SEED = 7


def make(folder: Path, *, aircraft: int = DEFAULT_AIRCRAFT, seed: int = DEFAULT_SEED, plain: bool = False) -> None:
    """Write an invented fleet into a new folder (with its dirty twin below it unless plain).

    Raises RequestError for a size out of range or a folder that holds something.
    """
    tables = fleet_tables(aircraft=aircraft, seed=seed, plain=plain)
    aside = new_folder(folder)
    try:
        write_tables(aside, tables)
        if not plain:
            dirty = aside / "dirty"
            dirty.mkdir()
            dirty_tables(dirty, tables)
        move_into_place(aside, folder)
    finally:
        shutil.rmtree(aside, ignore_errors=True)


def fleet_tables(*, aircraft: int, seed: int, plain: bool) -> dict[str, list[Row]]:
    """Return every table of the invented fleet."""
    flying = tails(aircraft, seed)
    scale = aircraft / sum(sub.share for sub in SUB_FLEETS)
    kinds = {tail.sub_fleet.engine_type for tail in flying}
    tables = {"settings": settings(aircraft), **_only(type_tables(scale), kinds)}
    past = live(flying, tables, scale=scale, seed=seed)
    lived = histories(past)
    where = places(past)
    tables |= {
        "aircraft": aircraft_rows(past, flying, lived.tails),
        "engines": engine_rows(past, where),
        "modules": module_rows(past, where),
        "parts": _parts(past, lived),
        "part_history": lived.parts,
        "installs": lived.installs,
        "removals": lived.removals,
        "margins": margin_rows(past, where, seed),
        "rating_changes": [
            {"tail": tail, "from_date": day, "rating": rating}
            for tail in past.changed_rating
            for day, rating in ((_entry(past, tail), "high"), ("2022-04-01", "mid"))
        ],
        **lease_tables(flying, seed, plain=plain),
    }
    _own(tables, owners(flying))
    tables["lease_delivery"] = delivery_rows(tables["modules"], tables["engines"], tables["leases"])
    if plain:
        smooth(tables)
    else:
        plant(tables)
    return tables


def _only(tables: dict[str, list[Row]], kinds: set[str]) -> dict[str, list[Row]]:
    """Leave out types that no aircraft flies, so that a small fleet is whole and no larger than it must be."""
    numbers = {row["part_number"] for row in tables["part_types"] if row["engine_type"] in kinds}
    result = {}
    for name, rows in tables.items():
        kept = [r for r in rows if r.get("engine_type", next(iter(kinds))) in kinds]
        result[name] = [r for r in kept if name != "part_limits" or r["part_number"] in numbers]
    return result


def _entry(past: Past, tail: str) -> str:
    return next(str(row["entry_date"]) for row in past.delivered["aircraft"] if row["tail"] == tail)


def _parts(past: Past, lived: Histories) -> list[Row]:
    hours: dict[str, float] = {}
    for row in lived.parts:
        hours[row["part_serial"]] = hours.get(row["part_serial"], 0.0) + row["hours"]
    rows = []
    for module in past.world.all_modules:
        for part in module.parts:
            serial = part_serial(part.serial)
            rows.append(
                {
                    "part_serial": serial,
                    "part_number": part.spec.part_number,
                    "module_serial": module.serial,
                    "cycles_since_new": sum(part.counts(module.run)),
                    "hours_since_new": round(hours.get(serial, 0.0), 2),
                    "status_substantiated": "yes",
                    "trace_to_birth": "yes",
                }
            )
    return rows


def _own(tables: dict[str, list[Row]], tail_owner: dict[str, str]) -> None:
    """Give everything on a leased tail to its lessor; the rest is the airline's own (owner blank)."""
    engine_owner = {}
    for row in tables["aircraft"]:
        row["owner"] = tail_owner.get(row["tail"], "")
    for row in tables["engines"]:
        row["owner"] = engine_owner[row["engine_serial"]] = tail_owner.get(row.get("tail", ""), "")
    module_owner = {}
    for row in tables["modules"]:
        row["owner"] = module_owner[row["module_serial"]] = engine_owner.get(row.get("engine_serial", ""), "")
    for row in tables["parts"]:
        row["owner"] = module_owner.get(row["module_serial"], "")
