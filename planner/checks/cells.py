"""Rules on one cell. The first rule that a cell breaks is the one that is told.

Each takes the table's name, the column and the cell's text without spaces around it, and returns what is wrong or None.
"""

from __future__ import annotations

import math
import re

from planner.cells import (
    EARLIEST,
    FORMULA_MARKS,
    LATEST,
    MOST_CHARACTERS,
    NotReadableError,
    date_in,
    number_in,
    whole_number_in,
)
from planner.checks.fault import Rule, Wrong, nearest, shown, stops
from planner.schema.column import Column

_CURRENCIES = re.compile(
    r"USD|EUR|GBP|JPY|CNY|CHF|AUD|CAD|SGD|HKD|INR|AED|SEK|NOK|DKK|BRL|MXN|KRW|ZAR|TRY|[$€£¥₹₩]", re.IGNORECASE
)
_COMMA = re.compile(r"[+-]?\d+,\d+")
_THOUSANDS = re.compile(r"[+-]?\d{1,3}([ ' ’._ ]\d{3})+([.,]\d+)?")
_WITH_WORD = re.compile(r"[+-]?\d[\d.,]*\s*[A-Za-z%°]+\.?[A-Za-z°/ ]*")
_OTHER_DATE = re.compile(
    r"\d{1,4}[./\\ -]\d{1,2}[./\\ -]\d{1,4}([T ].*)?|\d{5}|\d{8}"
    r"|\d{1,2}[ -]?[A-Za-z]{3,9}[ -]?\d{2,4}|[A-Za-z]{3,9} \d{1,2},? \d{4}"
)


def _is_number(column: Column) -> bool:
    return column.kind in ("integer", "number")


def _write(column: Column) -> str:
    return f"write {column.example}, say" if column.example else "mend the cell"


def installations_are_dated(table: str, column: Column, text: str) -> Wrong | None:
    if text or table not in ("installs", "part_history") or column.name not in ("on_date", "from_date"):
        return None
    return Wrong("a date", "the day of installation is missing; find it in the records, it is not guessed")


def rating_changes_are_dated(table: str, column: Column, text: str) -> Wrong | None:
    if text or table != "rating_changes" or column.name != "from_date":
        return None
    message = (
        "the day of the rating change is missing, so the cycles at each rating are not known; find it in the records"
    )
    return Wrong("a date", message)


def prices_are_given(table: str, column: Column, text: str) -> Wrong | None:
    del table
    if text or not column.required or "_usd" not in column.name:
        return None
    return Wrong(f"an amount in {column.unit}", f"the price is blank ({column.meaning}); a blank price is not zero")


def required_cells_are_filled(table: str, column: Column, text: str) -> Wrong | None:
    del table
    if text or not column.required:
        return None
    return Wrong(column.meaning or column.label, f"the cell is blank ({column.meaning}); {_write(column)}")


def cells_hold_no_formulas(table: str, column: Column, text: str) -> Wrong | None:
    del table
    if not text.startswith(FORMULA_MARKS):
        return None
    if _is_number(column) and text.startswith("+"):
        try:
            number_in(text)
        except NotReadableError:
            pass
        else:
            return None
    return Wrong("text or a number", f"{shown(text)} is a formula; write its value")


def cells_hold_one_short_line(table: str, column: Column, text: str) -> Wrong | None:
    del table, column
    if len(text) > MOST_CHARACTERS:
        return Wrong(f"at most {MOST_CHARACTERS} characters", f"the cell holds {len(text):,} characters; shorten it")
    if not text.isprintable():
        return Wrong("one line of printable text", "the cell holds a line break or an unprintable sign; take it out")
    return None


def prices_are_in_one_currency(table: str, column: Column, text: str) -> Wrong | None:
    del table
    if not _is_number(column) or "_usd" not in column.name or _CURRENCIES.search(text) is None:
        return None
    return Wrong(
        f"a bare number in {column.unit}", f"{text} names a currency; convert it to USD and write the bare number"
    )


def numbers_use_a_decimal_point(table: str, column: Column, text: str) -> Wrong | None:
    del table
    if not _is_number(column) or _COMMA.fullmatch(text) is None:
        return None
    message = f"{text} has a comma; write {text.replace(',', '.')} if it is a decimal sign, or leave it out"
    return Wrong("a decimal point and no thousands sign", message)


def numbers_have_no_thousands_signs(table: str, column: Column, text: str) -> Wrong | None:
    del table
    if not _is_number(column) or _THOUSANDS.fullmatch(text) is None or text.count(".") == 1:
        return None
    return Wrong("digits and at most one point", f"{text} has signs between thousands; leave them out")


def numbers_stand_without_units(table: str, column: Column, text: str) -> Wrong | None:
    del table
    if not _is_number(column) or _WITH_WORD.fullmatch(text) is None or _is_plain(text):
        return None
    unit = f" in {column.unit}" if column.unit else ""
    return Wrong(f"a bare number{unit}", f"{text} carries a word or unit; write the bare number{unit}")


def _is_plain(text: str) -> bool:
    try:
        number_in(text)
    except NotReadableError:
        return False
    return True


def numbers_are_numbers(table: str, column: Column, text: str) -> Wrong | None:
    del table
    if not text or not _is_number(column) or _is_plain(text):
        return None
    return Wrong("a number", f"{shown(text)} is not a number ({column.meaning}); {_write(column)}")


def whole_numbers_are_whole(table: str, column: Column, text: str) -> Wrong | None:
    del table
    if not text or column.kind != "integer":
        return None
    try:
        whole_number_in(text)
    except NotReadableError:
        return Wrong("a whole number", f"{shown(text)} is not a whole number ({column.meaning}); {_write(column)}")
    return None


def counts_and_amounts_are_not_negative(table: str, column: Column, text: str) -> Wrong | None:
    del table
    if not text or not _is_number(column) or column.low is None or column.low < 0 or number_in(text) >= 0:
        return None
    return Wrong("zero or more", f"{text} is negative ({column.label.lower()}: {column.meaning}); mend the record")


def numbers_lie_within_their_range(table: str, column: Column, text: str) -> Wrong | None:
    del table
    if not text or not _is_number(column):
        return None
    low = -math.inf if column.low is None else column.low
    high = math.inf if column.high is None else column.high
    if low <= number_in(text) <= high:
        return None
    unit = f" {column.unit}" if column.unit else ""
    expected = f"at least {low:g}{unit}" if high == math.inf else f"{low:g} to {high:,g}{unit}"
    return Wrong(expected, f"{text} cannot be ({column.label.lower()}: {column.meaning}); it lies outside {expected}")


def dates_are_written_year_month_day(table: str, column: Column, text: str) -> Wrong | None:
    del table
    if column.kind != "date" or not text or re.fullmatch(r"\d{4}-\d{2}-\d{2}", text) or not _OTHER_DATE.fullmatch(text):
        return None
    return Wrong("year-month-day as 2026-07-01", f"{text} is written in another form; write year-month-day")


def dates_exist_in_the_calendar(table: str, column: Column, text: str) -> Wrong | None:
    del table
    if column.kind != "date" or not text:
        return None
    try:
        date_in(text)
    except NotReadableError:
        return Wrong("a date as 2026-07-01", f"{shown(text)} is not a date; write year-month-day")
    return None


def dates_are_of_this_age(table: str, column: Column, text: str) -> Wrong | None:
    del table
    if column.kind != "date" or not text or EARLIEST <= date_in(text) <= LATEST:
        return None
    return Wrong(
        f"{EARLIEST.year} to {LATEST.year}", f"{text} lies outside {EARLIEST.year} to {LATEST.year}; mend the year"
    )


def flags_are_yes_or_no(table: str, column: Column, text: str) -> Wrong | None:
    del table
    if column.kind != "flag" or text in ("", "yes", "no"):
        return None
    return Wrong("yes or no", f"{shown(text)} is neither yes nor no; write one of them")


def words_are_among_the_allowed(table: str, column: Column, text: str) -> Wrong | None:
    del table
    if column.kind == "flag" or not column.choices or text in column.choices:
        return None
    allowed = ", ".join(choice or "blank" for choice in column.choices)
    close = nearest(text, filter(None, column.choices))
    ending = f"; did you mean {close}?" if close else ""
    return Wrong(allowed, f"{shown(text)} is not among: {allowed}{ending}")


CELL_RULES: tuple[Rule, ...] = (
    stops(installations_are_dated),
    stops(rating_changes_are_dated),
    stops(prices_are_given),
    stops(required_cells_are_filled),
    stops(cells_hold_no_formulas),
    stops(cells_hold_one_short_line),
    stops(prices_are_in_one_currency),
    stops(numbers_use_a_decimal_point),
    stops(numbers_have_no_thousands_signs),
    stops(numbers_stand_without_units),
    stops(numbers_are_numbers),
    stops(whole_numbers_are_whole),
    stops(counts_and_amounts_are_not_negative),
    stops(numbers_lie_within_their_range),
    stops(dates_are_written_year_month_day),
    stops(dates_exist_in_the_calendar),
    stops(dates_are_of_this_age),
    stops(flags_are_yes_or_no),
    stops(words_are_among_the_allowed),
)


def broken_rule(table: str, column: Column, text: str) -> tuple[Rule, Wrong]:
    """Return the first rule that an unreadable cell breaks. AssertionError: readable text, or a rule is missing."""
    for rule in CELL_RULES:
        wrong = rule.check(table, column, text)
        if wrong is not None:
            return rule, wrong
    raise AssertionError(f"no rule tells what is wrong with {text!r} in {table}.{column.name}")
