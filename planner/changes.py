"""What moved between two versions of the records, told by kind: swaps, visits, use, corrections, limits.

Rows are matched by their table's key; tables without a key (history, readings) by their whole rows. A counter that
grows between two as-of dates is use; one that falls, or grows while the date stands still, is a correction.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Iterator
from typing import Any, NamedTuple

from planner.records import Records, Rows
from planner.schema.registry import TABLES
from planner.settings import as_of

_WHERE = {
    ("modules", "engine_serial"),
    ("modules", "place"),
    ("modules", "base"),
    ("parts", "module_serial"),
    ("parts", "place"),
    ("engines", "tail"),
    ("engines", "position"),
    ("engines", "place"),
    ("engines", "base"),
}
_VISIT = {"shop", "visit", "removed_date", "inducted_date", "ready_date", "level_in_work", "first_run", "standard"}
_SINCE_WORK = ("_since_restoration", "_since_build")
_COUNTS = ("hours_since_new", "cycles_since_new")
_LIMIT_TABLES = ("part_limits", "ratings", "rating_changes", "watch", "standards")


class Change(NamedTuple):
    """One difference; ``what`` is one of CHANGE_KINDS."""

    table: str
    key: str
    what: str
    column: str
    before: str
    after: str
    note: str


def changes(before: Records, after: Records) -> tuple[Change, ...]:
    """Return every difference of two versions of a fleet's records, tables in the order of TABLES.md."""
    moved = as_of(dict(after.settings)) > as_of(dict(before.settings))
    found: list[Change] = []
    for name, table in TABLES.items():
        if table.key:
            found += _by_key(before[name], after[name], moved=moved)
        else:
            found += _by_row(before[name], after[name], moved=moved)
    return tuple(found)


def _keyed(rows: Rows) -> dict[tuple[Any, ...], int]:
    return {key: i for i, key in enumerate(zip(*(rows[name] for name in rows.table.key), strict=True))}


def _text(value: Any) -> str:
    if value is None:
        return ""
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, float):
        return f"{value:g}" if abs(value) < 1e5 else f"{value:.10g}"
    if isinstance(value, tuple):
        return " ".join(value)
    return str(value)


def _by_key(old: Rows, new: Rows, *, moved: bool) -> Iterator[Change]:
    before, after = _keyed(old), _keyed(new)
    name = new.table.name
    for key, i in after.items():
        label = " ".join(_text(part) for part in key if part not in (None, ""))
        if key not in before:
            yield Change(name, label, "new", "", "", label, f"{label} is new")
            continue
        for column in new.table.names:
            was, now = old[column][before[key]], new[column][i]
            if was != now:
                what, note = _kind(name, column, was, now, moved=moved)
                yield Change(name, label, what, column, _text(was), _text(now), note)
    for key in before:
        if key not in after:
            label = " ".join(_text(part) for part in key if part not in (None, ""))
            yield Change(name, label, "gone", "", label, "", f"{label} is no longer there")


def _kind(table: str, column: str, was: Any, now: Any, *, moved: bool) -> tuple[str, str]:
    """Return the kind of a changed cell and what it means."""
    if (table, column) in _WHERE:
        return "swap", f"moved from {_text(was) or 'elsewhere'} to {_text(now) or 'elsewhere'}"
    if column.endswith(_SINCE_WORK) and None not in (was, now):
        if now < was:
            return "visit", "counted anew, so work was done"
        return ("use", "flown") if moved else ("correction", "raised though the as-of date stands still")
    if column in _COUNTS and None not in (was, now):
        if now < was:
            return "correction", "a count since new fell"
        return ("use", "flown") if moved else ("correction", "raised though the as-of date stands still")
    if column in _VISIT:
        return "visit", "work or its dates changed"
    if column == "margin_lost_degC":
        return "use", "worn or restored"
    if table in _LIMIT_TABLES or column in ("rating", "rating_until", "rating_after"):
        return "limit", "a limit or rating changed"
    if "_usd" in column:
        return "price", "a price changed"
    if table in ("aircraft", "engines", "modules", "parts", "part_types"):
        return "correction", "the record itself was changed"
    return "other", "changed"


def _by_row(old: Rows, new: Rows, *, moved: bool) -> Iterator[Change]:
    """Compare rows without a key: what was there and is not is a correction of the past."""
    names = new.table.names
    before = Counter(zip(*(old[name] for name in names), strict=True))
    after = Counter(zip(*(new[name] for name in names), strict=True))
    name = new.table.name
    for row, count in (after - before).items():
        label, text = _text(row[0]), " ".join(filter(None, map(_text, row[1:])))
        for _ in range(count):
            kind = "use" if moved and name in ("part_history", "margins", "removals") else "new"
            yield Change(name, label, kind, "", "", text, "a row that was not there")
    for row, count in (before - after).items():
        label, text = _text(row[0]), " ".join(filter(None, map(_text, row[1:])))
        for _ in range(count):
            yield Change(name, label, "correction", "", text, "", "a row of the past is gone or was changed")
