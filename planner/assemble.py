"""From checked records to the fleet that a study starts from.

Generic by names: a field of a row in ``sim.fleet`` is the column of that name; ``x_day`` is the date column
``x_date`` or ``x`` in days from the as-of date. Only parts, bases, season and settings need words of their own.
"""

from __future__ import annotations

import dataclasses
import datetime as dt
from collections.abc import Callable, Sequence
from functools import cache
from pathlib import Path
from typing import Any, get_args, get_type_hints

from planner.checks.rules import check
from planner.part_life import flown_by_part
from planner.records import Records, Rows
from planner.settings import as_of
from planner.wear_in_degrees import in_degrees
from sim.errors import RecordsError
from sim.fleet import Base, Fleet, Part, Settings

_MISSING: dict[str, str] = {
    "season": "use is spread evenly over the year",
    "indices": "prices do not rise",
    "washes": "no engine is washed",
    "standards": "every module mates with every other",
    "teams": "an exchange on or near the wing waits for no team",
    "lease_market": "no spare engine can be leased in",
    "routes": "what lies at another base is at hand at once",
    "leases": "no aircraft or engine goes back to a lessor",
    "part_history": "all cycles of a part count at the rating with its lowest limit",
    "watch": "no finding limits an engine",
}
_WORDS = ("settings", "season", "bases", "parts", "assumptions")


def load(path: Path) -> Fleet:
    """Return the fleet of a folder or workbook.

    Raises RecordsError with every problem that stops the work, RequestError where there is no fleet.
    """
    records, found = check(path)
    stopping = tuple(problem for problem in found if problem.severity == "stops")
    if stopping:
        raise RecordsError(stopping)
    fleet = assemble(records)
    if not found:
        return fleet
    count = f"{len(found):,} warning{'s' if len(found) != 1 else ''}"
    note = f"the records carry {count}, each read as spoolwright check says"
    return dataclasses.replace(fleet, assumptions=(*fleet.assumptions, note))


def assemble(records: Records) -> Fleet:
    """Return the fleet that records describe; they must be free of problems that stop."""
    records, converted = in_degrees(records)
    day_zero = as_of(dict(records.settings))
    tables: dict[str, Any] = {
        name: _rows(records[name], kind, day_zero) for name, kind in _row_types().items() if name not in _WORDS
    }
    return Fleet(
        settings=_settings(records),
        season=_season(records),
        bases=_bases(records),
        parts=_parts(records, day_zero),
        assumptions=(*(f"{name}: {text}" for name, text in assumed(records).items()), *converted),
        **tables,
    )


def assumed(records: Records) -> dict[str, str]:
    """Return what holds instead of each table that is not there."""
    return {f"{name}.csv is missing": text for name, text in _MISSING.items() if not records.given(name)}


@cache
def _row_types() -> dict[str, type]:
    """Return the row type of each field of Fleet that holds rows."""
    hints = get_type_hints(Fleet)
    types: dict[str, type] = {name: get_args(hint)[0] for name, hint in hints.items() if get_args(hint)}
    return {name: kind for name, kind in types.items() if hasattr(kind, "__dataclass_fields__")}


def _days(dates: Sequence[dt.date | None], day_zero: dt.date) -> list[float | None]:
    known: dict[dt.date | None, float | None] = {None: None}
    for date in set(dates) - {None}:
        assert date is not None
        known[date] = float((date - day_zero).days)
    return [known[date] for date in dates]


def _column(rows: Rows, name: str, hint: Any, day_zero: dt.date) -> list[Any] | None:
    """Return the values of a field, or None where the table has no such column."""
    if name == "day" or name.endswith("_day"):
        stem = name.removesuffix("day").rstrip("_")
        for date in (f"{stem}_date", stem) if stem else ("date",):
            if date in rows.columns:
                return _days(rows[date], day_zero)
    if name not in rows.columns:
        return None
    if hint is bool and rows.table.column(name).kind != "flag":
        return [value == "yes" for value in rows[name]]
    return rows[name]


def _rows(rows: Rows, kind: Callable[..., Any], day_zero: dt.date, **more: list[Any]) -> tuple[Any, ...]:
    hints = get_type_hints(kind)
    columns = {name: _column(rows, name, hint, day_zero) for name, hint in hints.items() if name not in more}
    filled = {name: values for name, values in columns.items() if values is not None} | more
    names = tuple(filled)
    return tuple(kind(**dict(zip(names, row, strict=True))) for row in zip(*filled.values(), strict=True))


def _settings(records: Records) -> Settings:
    known = {field.name for field in dataclasses.fields(Settings)}
    return Settings(**{name: value for name, value in records.settings.items() if name in known})


def _season(records: Records) -> tuple[float, ...]:
    shares = dict(zip(records["season"]["month"], records["season"]["share"], strict=True))
    return tuple(float(shares.get(month, 1.0)) for month in range(1, 13))


def _bases(records: Records) -> tuple[Base, ...]:
    rows = records["bases"]
    days = zip(*(rows[f"hot_day_degC_{month:02d}"] for month in range(1, 13)), strict=True)
    both = zip(rows["base"], rows["environment"], days, strict=True)
    return tuple(Base(base=base, environment=factor, hot_day_degC=tuple(hot)) for base, factor, hot in both)


def _parts(records: Records, day_zero: dt.date) -> tuple[Part, ...]:
    lives = flown_by_part(records)
    return _rows(
        records["parts"],
        Part,
        day_zero,
        flown=[life.flown for life in lives],
        life_known=[life.known for life in lives],
    )
