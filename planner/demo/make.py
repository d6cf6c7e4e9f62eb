"""Making the demo: types as data, a lived past, contracts, and (unless plain) the planted complications."""

from __future__ import annotations

import shutil
from pathlib import Path
from typing import NamedTuple

from planner.demo.contracts import delivery_rows, lease_tables, owners
from planner.demo.dirty import write_dirty
from planner.demo.history import histories
from planner.demo.past import RATING_CHANGE, Past, live
from planner.demo.planted import Planted, plant
from planner.demo.scenario_tables import scenario_tables
from planner.demo.shelf import shelf
from planner.demo.state_tables import aircraft_rows, engine_rows, module_rows, part_rows
from planner.demo.sub_fleets import scale_of, tails
from planner.demo.type_tables import Row, type_tables
from planner.demo.watch import watch_rows
from planner.demo.write import move_into_place, new_folder, write_tables

DEFAULT_AIRCRAFT = 40
DEFAULT_SEED = 7
DIRTY_AIRCRAFT = 12  # enough for pasts that hold every fault; three of them are kept


class Demo(NamedTuple):
    """An invented fleet: its tables, and what is planted in them."""

    tables: dict[str, list[Row]]
    planted: tuple[Planted, ...]


def make(folder: Path, *, aircraft: int = DEFAULT_AIRCRAFT, seed: int = DEFAULT_SEED, plain: bool = False) -> None:
    """Write an invented fleet into a new folder (with its dirty twin below it unless plain).

    Raises RequestError for a size out of range or a folder that holds something.
    """
    aside = new_folder(folder)
    try:
        tables = fleet(aircraft=aircraft, seed=seed, plain=plain).tables
        write_tables(aside, tables)
        if not plain:
            (aside / "dirty").mkdir()
            write_dirty(aside / "dirty", before_dirt())
        move_into_place(aside, folder)
    finally:
        shutil.rmtree(aside, ignore_errors=True)


def before_dirt() -> dict[str, list[Row]]:
    """Return the fleet that the dirty twin is made of: the same small one whatever was asked for."""
    return fleet(aircraft=DIRTY_AIRCRAFT, seed=DEFAULT_SEED, plain=True).tables


def fleet(*, aircraft: int = DEFAULT_AIRCRAFT, seed: int = DEFAULT_SEED, plain: bool = False) -> Demo:
    """Return the invented fleet of that many aircraft today.

    Raises RequestError for a size out of range.
    """
    flying, scale = tails(aircraft, seed), scale_of(aircraft)
    kinds = sorted({tail.sub_fleet.engine_type for tail in flying})
    tables = scenario_tables(set(kinds), scale=scale) | type_tables(set(kinds))
    past = live(flying, tables, scale=scale, seed=seed)
    lived = histories(past)
    spare = shelf(kinds, scale=scale, seed=seed, plain=plain)
    tables |= {
        "aircraft": aircraft_rows(past, flying, lived),
        "engines": engine_rows(past),
        "modules": module_rows(past) + spare.modules,
        "parts": part_rows(past, lived) + spare.parts,
        "part_history": lived.parts + spare.history,
        "installs": lived.installs,
        "removals": lived.removals,
        "margins": past.readings,
        "rating_changes": _rating_changes(past),
        **lease_tables(flying, seed=seed, plain=plain),
    }
    tables["watch"] = watch_rows(tables)
    _own(tables, owners(flying))
    tables["lease_delivery"] = delivery_rows(tables["modules"], tables["engines"], tables["leases"])
    _leave(tables)
    return Demo(tables, () if plain else plant(tables))


def fleet_tables(*, aircraft: int, seed: int, plain: bool) -> dict[str, list[Row]]:
    """Return the tables alone."""
    return fleet(aircraft=aircraft, seed=seed, plain=plain).tables


def _rating_changes(past: Past) -> list[Row]:
    """Return the ratings of the tails that changed, from their first day on."""
    rows = []
    for aircraft in past.delivered["aircraft"]:
        if aircraft["tail"] in past.changed_rating:
            days = ((aircraft["entry_date"], aircraft["rating"]), (RATING_CHANGE.isoformat(), aircraft["rating_after"]))
            rows += [{"tail": aircraft["tail"], "from_date": day, "rating": rating} for day, rating in days]
    return rows


def _own(tables: dict[str, list[Row]], tail_owner: dict[str, str]) -> None:
    """Give everything on a leased tail to its lessor, and what is in an engine to the engine's owner; the rest is the
    airline's own (owner blank)."""
    engine_owner, module_owner = {}, {}
    for row in tables["aircraft"]:
        row["owner"] = tail_owner.get(row["tail"], "")
    for row in tables["engines"]:
        row["owner"] = engine_owner[row["engine_serial"]] = row.get("owner") or tail_owner.get(row.get("tail", ""), "")
    for row in tables["modules"]:
        row["owner"] = module_owner[row["module_serial"]] = engine_owner.get(row.get("engine_serial", ""), "")
    for row in tables["parts"]:
        row["owner"] = module_owner.get(row["module_serial"], "")


def _leave(tables: dict[str, list[Row]]) -> None:
    """One aircraft of the airline's own leaves WB in 2030."""
    own = [row for row in tables["aircraft"] if row["sub_fleet"] == "WB" and not row["owner"]]
    if own:
        own[-1]["exit_date"] = "2030-06-30"
