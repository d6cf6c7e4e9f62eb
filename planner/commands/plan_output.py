"""How tables of plans are printed: the schema's headings, numbers with separators, money in thousand USD."""

from __future__ import annotations

import datetime as dt
from collections.abc import Mapping, Sequence
from typing import Any

from planner.commands.output import table_text
from planner.schema.registry import OUTPUTS

Row = Mapping[str, Any]


def plan_table(name: str, rows: Sequence[Row], *, only: Sequence[str] = ()) -> str:
    """Return rows of an output table as text; ``only`` names the columns shown, in their order."""
    table = OUTPUTS[name]
    columns = [table.column(one) for one in (only or table.names)]
    numbers = [i for i, column in enumerate(columns) if column.kind in ("number", "integer")]
    headings = [column.heading.replace("(USD)", "(thousand USD)") for column in columns]
    cells = [[cell(column.name, row.get(column.name)) for column in columns] for row in rows]
    return table_text(headings, cells, right=numbers)


def cell(name: str, value: object) -> str:
    """Return one value as a person reads it."""
    if value is None or value == "":
        return ""
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, dt.date):
        return value.isoformat()
    if isinstance(value, (int, float)):
        number = float(value)
        if name.endswith("_usd") or name == "usd":
            return f"{number / 1e3:,.1f}"
        if name.endswith("_chance"):
            return f"{100.0 * number:.0f} %"
        return f"{number:,.1f}" if isinstance(value, float) and not number.is_integer() else f"{number:,.0f}"
    return str(value)
