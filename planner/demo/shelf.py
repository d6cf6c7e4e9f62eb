"""Spare modules on the shelf: bought used, restored, their life with the operator before in their parts' histories."""

from __future__ import annotations

import datetime as dt
from typing import NamedTuple

from planner.demo.deliver import add_module, type_of
from planner.demo.luck import between
from planner.demo.sub_fleets import AS_OF, SPARE_MODULES_FROM
from planner.demo.type_tables import Row

_SPARES = {"N": ("fan-booster", "LPT", "LPT", "HPT", "gearbox"), "W": ("fan", "LPT", "gearbox")}
_PLACES = {("N", "LPT", 1): "shop", ("N", "HPT", 0): "old standard"}
_IN_SHOP = {"place": "shop", "shop": "Bravo", "ready_date": "2026-08-20", "level_in_work": "restoration"}
_USED_FRAC = (0.30, 0.55)  # of the lowest limit in the module
_FLIGHT_HOURS = {"N": 1.7, "W": 5.0}
_CYCLES_A_DAY = {"N": 4.5, "W": 2.0}


class Shelf(NamedTuple):
    modules: list[Row]
    parts: list[Row]
    history: list[Row]


def shelf(kinds: list[str], *, scale: float, seed: int, plain: bool) -> Shelf:
    """Return the spare modules of the types that fly, in proportion, with their parts and histories."""
    tables: dict[str, list[Row]] = {"modules": [], "parts": []}
    history: list[Row] = []
    for kind in kinds:
        seen: dict[str, int] = {}
        for copy in range(max(1, round(scale))):
            for place, name in enumerate(_SPARES[kind]):
                turn = seen.get(name, 0)
                seen[name] = turn + 1
                # the number tells the copy and the place, so that a larger fleet keeps the serials of a smaller one
                number = SPARE_MODULES_FROM + 10 * copy + place + 1
                special = _PLACES.get((kind, name, turn), "")
                old = name == "LPT" or (special == "old standard" and not plain)
                parts = add_module(tables, kind, name, number, modified=not old, place={})
                history += _lived(tables["modules"][-1], parts, in_shop=special == "shop", seed=seed)
    return Shelf(tables["modules"], tables["parts"], history)


def _lived(module: Row, parts: list[Row], *, in_shop: bool, seed: int) -> list[Row]:
    """Fill in the life of a module and its parts, in place; return the parts' histories."""
    kind, name, serial = module["engine_type"], module["module"], module["module_serial"]
    row = type_of(kind)
    limits = [min(limits) for _, of_module, _, _, limits in row.parts if of_module == name]
    least = min(limits) if limits else 2 * row.row["build_goal_frac"] * 10_000
    cycles = round(least * between(*_USED_FRAC, seed, "used", serial))
    hours = round(cycles * _FLIGHT_HOURS[kind], 2)
    rating = row.ratings[-1][0] if kind == "W" else "mid"
    share = next(m.wear_share for m in row.modules if m.module == name)
    never_restored = row.wear[rating][4] * share
    since = cycles // 2 if in_shop else 0
    worn = row.wear[rating][2] * since / 1000.0 * share + row.wear[rating][0] * share if since else 0.0
    module |= {
        "hours_since_new": hours,
        "cycles_since_new": cycles,
        "hours_since_restoration": round(since * _FLIGHT_HOURS[kind], 2),
        "cycles_since_restoration": since,
        "hours_since_build": round(since * _FLIGHT_HOURS[kind], 2),
        "cycles_since_build": since,
        "first_run": "no",
        "margin_lost_degC": round(never_restored + worn, 3),
    }
    module |= _IN_SHOP if in_shop else {"place": "pool", "base": "Home"}
    last = AS_OF - dt.timedelta(days=round(between(120, 600, seed, "idle", serial)))
    first = last - dt.timedelta(days=round(cycles / _CYCLES_A_DAY[kind]) + 60)
    for part in parts:
        part |= {"cycles_since_new": cycles, "hours_since_new": hours}
    return [
        {
            "part_serial": part["part_serial"],
            "module_serial": serial,
            "rating": rating,
            "from_date": first.isoformat(),
            "to_date": last.isoformat(),
            "cycles": cycles,
            "hours": hours,
            "source": "records of the operator before",
        }
        for part in parts
    ]
