"""Rules on a table's headings and on the width of its rows."""

from __future__ import annotations

import re

from planner.checks.fault import Fault, Rule, did_you_mean, stops, warns
from planner.schema.registry import TABLES
from planner.sheet import Sheet

_HALF_NUMBER = re.compile(r"^\s*\d+\s*$")


def headings_have_no_stray_spaces(sheet: Sheet) -> list[Fault]:
    return [
        Fault(
            sheet.table,
            1,
            heading.strip(),
            f'"{heading}"',
            heading.strip(),
            f'the heading "{heading}" has spaces around it; read as {heading.strip()}, take them out',
        )
        for heading in sheet.headings
        if heading != heading.strip() and heading.strip()
    ]


def headings_are_known(sheet: Sheet) -> list[Fault]:
    names = TABLES[sheet.table].names
    return [
        Fault(
            sheet.table,
            1,
            heading.strip(),
            heading.strip(),
            "a column of TABLES.md",
            f"the column {heading.strip()} is not known and is not read{did_you_mean(heading, names)}",
        )
        for heading in sheet.headings
        if heading.strip() and heading.strip() not in names
    ]


def headings_are_not_repeated(sheet: Sheet) -> list[Fault]:
    seen: set[str] = set()
    faults = []
    for heading in map(str.strip, sheet.headings):
        if heading and heading in seen:
            message = f"the column {heading} stands twice; keep one"
            faults.append(Fault(sheet.table, 1, heading, heading, "one column of each name", message))
        seen.add(heading)
    return faults


def required_columns_are_there(sheet: Sheet) -> list[Fault]:
    headings = [heading.strip() for heading in sheet.headings]
    strangers = [heading for heading in headings if heading not in TABLES[sheet.table].names]
    return [
        Fault(
            sheet.table,
            1,
            column.name,
            ", ".join(headings[:12]) or "no headings",
            column.name,
            f"the column {column.name} ({column.meaning}) is missing; add it"
            + (f", or rename one of: {', '.join(strangers[:5])}" if strangers else ""),
        )
        for column in TABLES[sheet.table].columns
        if column.required and column.name not in headings
    ]


def rows_are_as_wide_as_the_headings(sheet: Sheet) -> list[Fault]:
    width = len(sheet.headings)
    faults = []
    for number, cells in zip(sheet.numbers, sheet.rows, strict=True):
        extra = len(cells) - width
        if extra > 0 and not any(cells[width:]):
            extra = 0
        if extra == 0:
            continue
        message = f"the row has {len(cells)} cells under {width} headings"
        pairs = [i for i in range(len(cells) - 1) if _HALF_NUMBER.match(cells[i]) and _HALF_NUMBER.match(cells[i + 1])]
        if extra > 0 and pairs:
            first = pairs[0]
            message += (
                f"; is {cells[first].strip()},{cells[first + 1].strip()} a number with a decimal comma? write a point"
            )
        elif extra > 0:
            message += "; put a cell that holds a comma between quotation marks"
        else:
            message += "; fill the row up with commas"
        faults.append(Fault(sheet.table, number, "", f"{len(cells)} cells", f"{width} cells", message))
    return faults


HEADING_RULES: tuple[Rule, ...] = (
    warns(headings_have_no_stray_spaces),
    warns(headings_are_known),
    stops(headings_are_not_repeated),
    stops(required_columns_are_there),
    stops(rows_are_as_wide_as_the_headings),
)
