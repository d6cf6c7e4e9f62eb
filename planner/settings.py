"""The settings of a fleet, read from rows of name and value."""

from __future__ import annotations

import datetime as dt
from typing import Any

from planner.cells import NotReadableError, value_in
from planner.checks.cells import broken_rule
from planner.checks.fault import Fault, Rule, did_you_mean, problems, stops, warns
from planner.records import Rows
from planner.schema.column import Column
from planner.schema.setting_tables import SETTINGS
from sim.errors import Problem

_BY_NAME = {setting.name: setting for setting in SETTINGS}


def column_of(name: str) -> Column:
    """Return a setting as a column, so that its value is read by the rules for cells."""
    setting = _BY_NAME[name]
    return Column(
        name=name,
        kind=setting.kind,  # type: ignore[arg-type]
        label=name,
        meaning=setting.meaning,
        required=setting.default is None,
        low=setting.low,
        high=setting.high,
        choices=("yes", "no") if setting.kind == "flag" else (),
    )


def settings_are_known(rows: Rows) -> list[Fault]:
    return [
        Fault(
            "settings",
            row,
            "name",
            name,
            "a setting of TABLES.md",
            f"{name} is not known and is not read{did_you_mean(name, _BY_NAME)}",
        )
        for row, name in rows.pick("name")
        if name and name not in _BY_NAME
    ]


def the_as_of_date_is_given(rows: Rows) -> list[Fault]:
    if "as_of" in rows["name"]:
        return []
    message = "the setting as_of is missing: the day on which the records are true; add the row as_of,2026-07-01, say"
    return [Fault("settings", None, "name", "no as_of", "a date", message)]


SETTING_RULES: tuple[Rule, ...] = (warns(settings_are_known), stops(the_as_of_date_is_given))


def settings_in(rows: Rows, *, readable: bool) -> tuple[dict[str, Any], list[Problem]]:
    """Return every setting's value (its default where no row gives one) and the problems of the rows.

    ``readable`` is false where the file itself is at fault, so that its blanks are not told again.
    """
    values: dict[str, Any] = {}
    found: list[Problem] = []
    for name, setting in _BY_NAME.items():
        values[name] = None if not setting.default else value_in(column_of(name), setting.default)
    for row, name, text in rows.pick("name", "value"):
        if name not in _BY_NAME or text is None:
            continue
        column = column_of(name)
        try:
            values[name] = value_in(column, text.strip())
        except NotReadableError:
            rule, wrong = broken_rule("settings", column, text.strip())
            fault = Fault("settings", row, name, text, wrong.expected, wrong.message)
            found += problems(rule, [fault], file=rows.file)
    if readable:
        for rule in SETTING_RULES:
            found += problems(rule, rule.check(rows), file=rows.file or "settings.csv")
    return values, found


def as_of(settings: dict[str, Any]) -> dt.date:
    """Return the as-of date, or a stand-in where the records give none (they cannot be used then)."""
    day: dt.date | None = settings.get("as_of")
    return day or dt.date(2000, 1, 1)
