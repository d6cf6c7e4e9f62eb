"""From a cell's text to a typed value, or to None when it does not say one."""

from __future__ import annotations

import datetime as dt
import math
import re
from typing import Any

from planner.schema.column import Column

MOST_CHARACTERS = 400
EARLIEST, LATEST = dt.date(1960, 1, 1), dt.date(2120, 12, 31)
"""Dates outside are absurd: before the first turbofans flew in airlines, or past any horizon."""
FORMULA_MARKS = ("=", "+", "@")
_NUMBER = re.compile(r"[+-]?(\d{1,15}(\.\d*)?|\.\d+)([eE][+-]?\d{1,2})?", re.ASCII)
_WHOLE = re.compile(r"[+-]?\d{1,15}(\.0*)?", re.ASCII)
_DAY = re.compile(r"\d{4}-\d{2}-\d{2}", re.ASCII)


class NotReadableError(ValueError):
    """The text does not say a value of the column's kind."""


def number_in(text: str) -> float:
    """Return the number that a text writes with a decimal point; NotReadableError otherwise."""
    if _NUMBER.fullmatch(text) is None:
        raise NotReadableError(text)
    return float(text)


def whole_number_in(text: str) -> int:
    if text.isascii() and text.isdigit() and len(text) <= 15:
        return int(text)
    if _WHOLE.fullmatch(text) is None:
        raise NotReadableError(text)
    return int(text.split(".")[0])


def date_in(text: str) -> dt.date:
    """Return the date that a text writes as year-month-day; NotReadableError otherwise."""
    if _DAY.fullmatch(text) is None:
        raise NotReadableError(text)
    try:
        return dt.date.fromisoformat(text)
    except ValueError as error:
        raise NotReadableError(text) from error


def default_of(column: Column) -> Any:
    """Return what a blank optional cell means."""
    if column.kind in ("text", "serial", "choice"):
        return "" if column.default is None else str(column.default)
    if column.kind == "flag":
        return column.default == "yes"
    if column.kind == "list":
        return tuple(str(column.default or "").split())
    if column.kind == "integer" and column.default is not None:
        return int(column.default)
    if column.kind == "number" and column.default is not None:
        return float(column.default)
    return None


def value_in(column: Column, text: str) -> Any:
    """Return the typed value of a cell without spaces around it; NotReadableError when the text does not say one.

    A blank cell has the column's default; a required cell may not be blank.
    """
    if not text:
        if column.required:
            raise NotReadableError(text)
        return default_of(column)
    kind = column.kind
    if kind in ("integer", "number"):
        return _in_range(column, whole_number_in(text) if kind == "integer" else number_in(text))
    if kind == "date":
        day = date_in(text)
        if not EARLIEST <= day <= LATEST:
            raise NotReadableError(text)
        return day
    if kind == "flag":
        if text not in ("yes", "no"):
            raise NotReadableError(text)
        return text == "yes"
    if text[0] in FORMULA_MARKS or len(text) > MOST_CHARACTERS or not text.isprintable():
        raise NotReadableError(text)
    if column.choices and text not in column.choices:
        raise NotReadableError(text)
    return tuple(text.split()) if kind == "list" else text


def _in_range(column: Column, value: float) -> float:
    low = -math.inf if column.low is None else column.low
    high = math.inf if column.high is None else column.high
    if not low <= value <= high:
        raise NotReadableError(str(value))
    return value
