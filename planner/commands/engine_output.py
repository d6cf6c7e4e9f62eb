"""How the answer to ``engine`` is asked for and printed."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from pathlib import Path
from typing import Any

import click

from planner.commands.output import envelope, footer, print_json, table_text
from planner.engine_fleet import DEMO, FleetAnswer, ask
from planner.schema.registry import OUTPUTS

Row = Mapping[str, Any]


def print_engine(
    fleet: Path, *, engine_type: str | None, spare: str | None, engine_serial: str | None, as_json: bool
) -> None:
    """Print a type's answer, or that of all types, as tables or as one JSON object."""
    found = ask(fleet, engine_type=engine_type, spare=spare, engine_serial=engine_serial)
    if as_json:
        print_json(envelope("engine", found.tables, inputs=found.inputs, warnings=found.warnings))
    else:
        click.echo(_text(found))


def _text(found: FleetAnswer) -> str:
    tables = found.tables
    parts = [
        *([DEMO] if DEMO in found.warnings else []),
        "Stations, highest rating",
        _table("stations", tables["stations"], {"flow_kg_per_s": 1, "temperature_K": 1, "pressure_kPa": 1}),
        "",
        "One point lost in each component, at constant thrust (positive: hotter, more fuel; in brackets the band)",
        _coefficients(tables["coefficients"]),
        "",
        "Ratings",
        _table("ratings_heat", tables["ratings"], dict.fromkeys(OUTPUTS["ratings_heat"].names, 1)),
    ]
    if tables["restorations"]:
        parts += ["", "What restoring a module brings, the mean over those that fly (per engine and year)"]
        parts.append(_table("restorations", tables["restorations"], dict.fromkeys(OUTPUTS["restorations"].names, 1)))
        parts += [*found.sentences]
    if tables["spare_on_engine"]:
        parts += ["", "The spare module on that engine"]
        parts.append(
            _table("spare_on_engine", tables["spare_on_engine"], dict.fromkeys(OUTPUTS["spare_on_engine"].names, 1))
        )
    return "\n".join([*parts, "", footer([one for one in found.warnings if one != DEMO], inputs=found.inputs)])


def _table(name: str, rows: Sequence[Row], digits: Mapping[str, int]) -> str:
    """Return rows as a plain table with the schema's headings."""
    columns = [column for column in OUTPUTS[name].columns if not column.name.endswith(("_low", "_high"))]
    numbers = [i for i, column in enumerate(columns) if column.kind in ("number", "integer")]
    cells = [[_cell(row[column.name], digits.get(column.name, 4)) for column in columns] for row in rows]
    return table_text([column.heading for column in columns], cells, right=numbers)


def _cell(value: Any, digits: int) -> str:
    if value is None:
        return ""
    if isinstance(value, float):
        return f"{value:,.0f}" if abs(value) >= 10_000 else f"{value:,.{digits}f}"
    return str(value)


def _coefficients(rows: Sequence[Row]) -> str:
    def banded(name: str, factor: float, digits: int) -> Callable[[Row], str]:
        def cell(row: Row) -> str:
            low, value, high = (factor * row[f"{name}{end}"] for end in ("_low", "", "_high"))
            return f"{value:+.{digits}f} ({low:+.{digits}f} to {high:+.{digits}f})"

        return cell

    columns: list[tuple[str, Callable[[Row], str]]] = [
        ("Type", lambda row: row["engine_type"]),
        ("Module", lambda row: row["module"]),
        ("Component", lambda row: row["component"]),
        ("Change", lambda row: row["change"].replace("_", " ")),
        ("EGT, K", banded("egt_K", 1.0, 1)),
        ("Take-off fuel, %", banded("fuel_takeoff_frac", 100.0, 2)),
        ("Cruise fuel, %", banded("fuel_cruise_frac", 100.0, 2)),
    ]
    cells = [[cell(row) for _, cell in columns] for row in rows]
    return table_text([heading for heading, _ in columns], cells, right=(4, 5, 6))
