"""The fleet as delivered: aircraft, engines, modules and parts, each new, with serials that say whose they are.

The five digits of an engine's serial return in its modules' and parts' serials, so that a part found on a shelf tells
the engine that it was born in.
"""

from __future__ import annotations

import datetime as dt

from planner.demo.sub_fleets import SPARES_FROM, Tail
from planner.demo.type_tables import Row
from planner.demo.types import DEMO_TYPES, DemoType

CODES = {
    "fan-booster": "FB",
    "fan": "FN",
    "booster": "BO",
    "HPC": "HC",
    "combustor": "CB",
    "HPT": "HT",
    "LPT": "LT",
    "gearbox": "GB",
}
_SPARE_ENGINES = {"N": 5, "W": 3}
_BUILDS = 100_000  # a part's number moves on by this at each replacement in its place
_MODIFIED_FROM = dt.date(2021, 7, 1)  # deliveries from here on carry the modified HPT and the new LPT of type N


def type_of(kind: str) -> DemoType:
    return next(one for one in DEMO_TYPES if one.row["engine_type"] == kind)


def deliver(tails: list[Tail], *, scale: float) -> dict[str, list[Row]]:
    """Return aircraft, engines, modules and parts as they were delivered, spare engines among them."""
    tables: dict[str, list[Row]] = {"aircraft": [], "engines": [], "modules": [], "parts": []}
    for tail in tails:
        tables["aircraft"].append(_aircraft(tail))
        for position in (1, 2):
            place = {"place": "wing", "tail": tail.tail, "position": position}
            number = tail.first_engine + position - 1
            _engine(tables, tail.sub_fleet.engine_type, number, modified=tail.entry >= _MODIFIED_FROM, place=place)
    for kind in sorted({tail.sub_fleet.engine_type for tail in tails}):
        for number in range(spare_engines(kind, scale)):
            # first and third of each five came with the older aircraft
            modified = number % 5 not in (0, 2)
            place = {"place": "spare", "base": "Home"}
            _engine(tables, kind, SPARES_FROM + number + 1, modified=modified, place=place)
    return tables


def spare_engines(kind: str, scale: float) -> int:
    """Return how many spare engines of a type the fleet holds: in proportion, at least one."""
    return max(1, round(_SPARE_ENGINES[kind] * scale))


def engine_serial(kind: str, number: int) -> str:
    return f"{kind}E{number:05d}"


def _aircraft(tail: Tail) -> Row:
    sub = tail.sub_fleet
    return {
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


def _engine(tables: dict[str, list[Row]], kind: str, number: int, *, modified: bool, place: Row) -> None:
    serial = engine_serial(kind, number)
    engine = {"engine_serial": serial, "engine_type": kind, "first_run": "yes", "standard": "B" if modified else "A"}
    tables["engines"].append(engine | place)
    for module in type_of(kind).modules:
        add_module(tables, kind, module.module, number, modified=modified, place={"engine_serial": serial})


def add_module(
    tables: dict[str, list[Row]], kind: str, name: str, number: int, *, modified: bool, place: Row
) -> list[Row]:
    """Add a new module with its parts, and return the parts' rows."""
    serial = f"{kind}{CODES[name]}{number:05d}"
    module = {"module_serial": serial, "engine_type": kind, "module": name, "first_run": "yes"}
    tables["modules"].append(module | {"standard": _standard(kind, name, modified)} | place)
    parts = [
        {
            "part_serial": f"{part.replace('-', '')}-{_BUILDS + number}",
            "part_number": part,
            "module_serial": serial,
            "cycles_since_new": 0,
            "hours_since_new": 0,
            "status_substantiated": "yes",
            "trace_to_birth": "yes",
        }
        for part, module_of, *_ in type_of(kind).parts
        if module_of == name
    ]
    tables["parts"] += parts
    return parts


def _standard(kind: str, name: str, modified: bool) -> str:
    if kind != "N" or name not in ("HPT", "LPT"):
        return ""
    return {"HPT": ("pre", "post"), "LPT": ("old", "new")}[name][modified]


def part_serial(serial: str) -> str:
    """Return the serial of a part that the simulation has named ``first~count``: its number moves on."""
    root, _, count = serial.partition("~")
    if not count:
        return root
    stem, _, number = root.rpartition("-")
    return f"{stem}-{int(number) + _BUILDS * int(count)}"
