"""Rules on a file before its cells are read."""

from __future__ import annotations

import csv
import re

from planner.checks.fault import Fault, Rule, stops
from planner.sheet import MOST_BYTES, Source, delimiter_of, sheet_of, without_mark

_CONTROL = re.compile(rb"[\x00-\x08\x0b\x0c\x0e-\x1f\x7f]")


def files_are_of_a_size_that_can_be_tables(source: Source) -> list[Fault]:
    if source.size <= MOST_BYTES:
        return []
    most = f"at most {MOST_BYTES // 1_000_000} MB"
    found = f"{source.size / 1e6:,.0f} MB"
    return [
        Fault(source.table, None, "", found, most, f"{found} is more than the {most[8:]} of a table; split the fleet")
    ]


def text_is_written_in_utf_8(source: Source) -> list[Fault]:
    data = without_mark(source.data)
    try:
        data.decode("utf-8")
    except UnicodeDecodeError as error:
        row = data.count(b"\n", 0, error.start) + 1
        found = f"byte 0x{data[error.start]:02x}"
        wide = data.startswith((b"\xff\xfe", b"\xfe\xff"))
        why = "the file is written in UTF-16" if wide else f"{found} cannot be read"
        return [Fault(source.table, row, "", found, "UTF-8", f"{why}; save the file as CSV UTF-8")]
    return []


def text_holds_no_control_characters(source: Source) -> list[Fault]:
    match = _CONTROL.search(source.data)
    if match is None:
        return []
    row = source.data.count(b"\n", 0, match.start()) + 1
    found = f"character 0x{match.group()[0]:02x}"
    message = f"{found} does not belong in a table; is this a CSV file? save it as CSV UTF-8"
    return [Fault(source.table, row, "", found, "printable text", message)]


def cells_are_parted_by_commas(source: Source) -> list[Fault]:
    mark = delimiter_of(source.data)
    if mark == ",":
        return []
    name = {";": "semicolons", "\t": "tabs", "|": "bars"}[mark]
    message = f"cells are parted by {name}; save the file with commas between cells and points in numbers"
    return [Fault(source.table, 1, "", name, "commas", message)]


def quotes_are_closed_and_rows_can_be_told_apart(source: Source) -> list[Fault]:
    try:
        sheet_of(source)
    except csv.Error as error:
        message = f"the rows cannot be told apart ({error}); look for a quotation mark without its fellow"
        return [Fault(source.table, None, "", str(error), "rows of a CSV file", message)]
    return []


SIZE_RULE = stops(files_are_of_a_size_that_can_be_tables)
BYTE_RULES: tuple[Rule, ...] = (stops(text_is_written_in_utf_8), stops(text_holds_no_control_characters))
"""A file that breaks one of these is not read further."""
FORM_RULES: tuple[Rule, ...] = (stops(cells_are_parted_by_commas),)
ROW_RULE = stops(quotes_are_closed_and_rows_can_be_told_apart)
FILE_RULES: tuple[Rule, ...] = (SIZE_RULE, *BYTE_RULES, *FORM_RULES, ROW_RULE)
