"""Rules on keys, references and the look of serials."""

from __future__ import annotations

import re
from collections.abc import Iterator

from planner.checks.facts import Facts
from planner.checks.fault import Fault, Rule, did_you_mean, stops, warns
from planner.schema.registry import TABLES

Reference = tuple[str, tuple[str, ...], str, tuple[str, ...]]

_MORE_REFERENCES: tuple[Reference, ...] = (
    ("engines", ("shop",), "shops", ("shop",)),
    ("engines", ("base",), "bases", ("base",)),
    ("modules", ("shop",), "shops", ("shop",)),
    ("modules", ("base",), "bases", ("base",)),
    ("teams", ("base",), "bases", ("base",)),
    ("slots", ("shop",), "shops", ("shop",)),
    ("slots", ("engine_serial",), "engines", ("engine_serial",)),
    ("leases", ("tail",), "aircraft", ("tail",)),
    ("leases", ("engine_serial",), "engines", ("engine_serial",)),
    ("lease_delivery", ("lease",), "leases", ("lease",)),
    ("reserve_accounts", ("lease",), "leases", ("lease",)),
    ("part_types", ("index",), "indices", ("index",)),
)
_SERIAL_COLUMNS: dict[str, tuple[tuple[str, str], ...]] = {
    "tail": (
        ("aircraft", "tail"),
        ("engines", "tail"),
        ("part_history", "tail"),
        ("leases", "tail"),
        ("rating_changes", "tail"),
    ),
    "engine": (
        ("engines", "engine_serial"),
        ("modules", "engine_serial"),
        ("part_history", "engine_serial"),
        ("margins", "engine_serial"),
        ("leases", "engine_serial"),
    ),
    "module": (
        ("modules", "module_serial"),
        ("parts", "module_serial"),
        ("part_history", "module_serial"),
        ("removals", "serial"),
    ),
    "part": (("parts", "part_serial"), ("part_history", "part_serial")),
    "part number": (
        ("part_types", "part_number"),
        ("parts", "part_number"),
        ("part_limits", "part_number"),
    ),
}
_LOOKS = str.maketrans({"O": "0", "I": "1", "L": "1", "-": "", " ": "", ".": "", "/": "", "_": ""})
_ZEROS = re.compile(r"(?<!\d)0+(?=\d)")


def look_of(serial: str) -> str:
    """Return what a hurried reader sees: O as 0, I and l as 1, no hyphens, no leading zeros, one case."""
    return _ZEROS.sub("", serial.upper().translate(_LOOKS))


def keys_are_unique(facts: Facts) -> Iterator[Fault]:
    for name, table in TABLES.items():
        rows = facts.records[name]
        if not table.key or not len(rows):
            continue
        bad = {row for row, column in rows.faulty if column in table.key}
        seen: dict[tuple[object, ...], int] = {}
        for row, *key in rows.pick(*table.key):
            values = tuple(key)
            if row in bad or (values[0] in (None, "")):
                continue
            if values in seen:
                shown = " ".join(str(value) for value in values if value not in (None, ""))
                message = f"{shown} stands already in row {seen[values]}; keep the row that is true"
                yield Fault(name, row, table.key[0], shown, "each key once", message)
            else:
                seen[values] = row


def references_exist(facts: Facts) -> Iterator[Fault]:
    own = ((name, here, there, names) for name, table in TABLES.items() for here, there, names in table.references)
    for table, here, there, names in (*own, *_MORE_REFERENCES):
        if not facts.told(there):
            continue
        known = set(zip(*(facts.records[there][name] for name in names), strict=True))
        for row, *values in facts.records[table].pick(*here):
            key = tuple(values)
            if key in known or any(value in (None, "") for value in key):
                continue
            shown = " ".join(map(str, key))
            close = did_you_mean(shown, (" ".join(map(str, k)) for k in known if None not in k))
            message = f"{shown} is not in {there}{close}"
            message += "" if close else "; add it there or mend the cell"
            yield Fault(table, row, here[-1], shown, f"a row of {there}", message)


def ratings_belong_to_their_type(facts: Facts) -> Iterator[Fault]:
    if not facts.told("ratings"):
        return
    kinds = {number: fact.engine_type for number, fact in facts.numbers.items()}
    serials = dict(zip(facts.records["parts"]["part_serial"], facts.records["parts"]["part_number"], strict=True))
    tails = {tail: fact.engine_type for tail, fact in facts.tails.items()}
    looked: tuple[tuple[str, str, str, dict[str, str]], ...] = (
        ("part_limits", "part_number", "rating", kinds),
        ("part_history", "part_serial", "rating", {s: kinds.get(n, "") for s, n in serials.items() if s}),
        ("rating_changes", "tail", "rating", tails),
        ("aircraft", "tail", "rating_after", tails),
    )
    for table, key, column, kind_of in looked:
        for row, owner, rating in facts.records[table].pick(key, column):
            kind = kind_of.get(owner, "")
            known = facts.thrusts.get(kind)
            if known and rating and rating not in known:
                message = f"{rating} is no rating of type {kind} (it has {', '.join(known)})"
                message += did_you_mean(rating, known)
                yield Fault(table, row, column, rating, ", ".join(known), message)


def serials_do_not_look_alike(facts: Facts) -> Iterator[Fault]:
    for kind, columns in _SERIAL_COLUMNS.items():
        known: dict[str, str] = {}
        seen: set[str] = set()
        for table, column in columns:
            rows = facts.records[table]
            # read backwards, so that the first row of each text stays
            first = dict(zip(reversed(rows[column]), reversed(rows.numbers), strict=True))
            for text, row in sorted(first.items(), key=lambda item: item[1]):
                if not text or text in seen:
                    continue
                seen.add(text)
                look = look_of(text)
                other = known.setdefault(look, text)
                if other != text:
                    message = f"{kind} {text} looks like {other} of another row; read as two, mend it if they are one"
                    yield Fault(table, row, column, text, other, message)


KEY_RULES: tuple[Rule, ...] = (
    stops(keys_are_unique),
    stops(references_exist),
    stops(ratings_belong_to_their_type),
    warns(serials_do_not_look_alike),
)
