"""What every table and column means, as the text of planner/TABLES.md; a test compares the two."""

from __future__ import annotations

from planner.schema.column import Column, Table
from planner.schema.registry import OUTPUTS, TABLES
from planner.schema.setting_tables import SETTINGS

_HEAD = """# The tables

One folder of CSV files (UTF-8, commas between cells, points in numbers, dates as 2026-07-01, one table a file, named
`TABLE.csv`), or one Excel workbook with a sheet a table. Names and units are the contract. A blank optional cell takes
the default shown; a blank *life* is unknown, hence zero. Serials and part numbers are text, kept as written. A table
that is not marked *needed* may be missing, and every answer says what it assumed instead. `spoolwright template FOLDER`
writes them all blank; `spoolwright check FOLDER` tells what is wrong in yours. This page is made from the program's own
schema.
"""


def tables_text() -> str:
    """Return the whole page."""
    parts = [_HEAD, "## Tables that are read\n"]
    for table in TABLES.values():
        parts.append(_table(table))
        if table.name == "settings":
            parts.append(_settings())
    parts.append("## Tables that answers hold\n")
    parts += [_table(table, results=True) for table in OUTPUTS.values()]
    return "\n".join(parts).rstrip() + "\n"


def _table(table: Table, *, results: bool = False) -> str:
    lines = [f"### {table.name}\n", f"A row is {table.row}." + (" Needed." if table.needed else "")]
    if table.key:
        lines.append(f"Key: {', '.join(table.key)}.")
    for here, there, _ in table.references:
        lines.append(f"`{', '.join(here)}` must exist in {there}.")
    if results:
        lines += ["", "| column | unit | meaning |", "|---|---|---|"]
        lines += [f"| {column.name} | {column.unit} | {_cell(column.meaning)} |" for column in table.columns]
    else:
        lines += ["", "| column | unit | kind | blank means | range or words | meaning |", "|---|---|---|---|---|---|"]
        lines += [_column(column) for column in table.columns]
    return "\n".join(lines) + "\n"


def _column(column: Column) -> str:
    blank = "must be filled" if column.required else _default(column)
    return f"| {column.name} | {column.unit} | {column.kind} | {blank} | {_range(column)} | {_cell(column.meaning)} |"


def _default(column: Column) -> str:
    return "blank" if column.default in (None, "") else str(column.default)


def _range(column: Column) -> str:
    if column.choices:
        return ", ".join(choice or "blank" for choice in column.choices)
    if column.kind not in ("integer", "number"):
        return ""
    low = "" if column.low is None else f"from {column.low:,.10g}"
    high = "" if column.high is None else f"to {column.high:,.10g}"
    return f"{low} {high}".strip()


def _cell(text: str) -> str:
    return text.replace("|", "/")


def _settings() -> str:
    lines = ["| setting | kind | default | meaning |", "|---|---|---|---|"]
    for setting in SETTINGS:
        default = "must be given" if setting.default is None else setting.default or "blank"
        lines.append(f"| {setting.name} | {setting.kind} | {default} | {_cell(setting.meaning)} |")
    return "\n".join(lines) + "\n"
