"""How the answer to ``fit`` is asked for, written and printed."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from pathlib import Path
from typing import Any

import click

from planner.commands.output import envelope, footer, print_json, table_text
from planner.fit import FitAnswer, ask, write
from sim.errors import RequestError

Row = Mapping[str, Any]
Cell = Callable[[Row], Any]


def print_fit(fleet: Path, *, folder: Path | None, engine_serial: str | None, as_json: bool) -> None:
    """Print the answer as tables or one JSON object; write it first where a folder is given."""
    found = ask(fleet)
    if engine_serial is not None:
        found = only(found, engine_serial)
    written = [] if folder is None else write(found, folder, fleet=fleet)
    for path in written:
        click.echo(f"written {path}", err=True)
    if as_json:
        # readings with their fits are many; they come for one engine
        shown = {name: rows for name, rows in found.tables.items() if name != "ahead" or engine_serial is not None}
        result = {**shown, "written": [str(path) for path in written]}
        print_json(envelope("fit", result, inputs=found.inputs, warnings=found.warnings))
    else:
        click.echo(_text(found, in_full=engine_serial is not None))


def only(found: FitAnswer, engine_serial: str) -> FitAnswer:
    """Return the answer with one engine's rows. Raises RequestError for an engine without readings."""
    have = [row["engine_serial"] for row in found.tables["margins"]]
    if engine_serial not in have:
        expected = "an engine with readings" + (f", such as {have[0]}" if have else "")
        raise RequestError("--engine", engine_serial, expected)
    kept = {
        name: [row for row in rows if row.get("engine_serial", engine_serial) == engine_serial]
        for name, rows in found.tables.items()
    }
    return found._replace(tables=kept)


def _text(found: FitAnswer, *, in_full: bool) -> str:
    parts = [*found.sentences]
    for title, rows, columns in _blocks(found.tables, in_full=in_full):
        if rows:
            heads = [name for name, _ in columns]
            parts += ["", title, table_text(heads, [[cell(row) for _, cell in columns] for row in rows], right=[])]
    return "\n".join([*parts, "", footer(found.warnings, inputs=found.inputs)])


def _blocks(
    tables: Mapping[str, Sequence[Row]], *, in_full: bool
) -> list[tuple[str, Sequence[Row], list[tuple[str, Cell]]]]:
    kind: list[tuple[str, Cell]] = [("Type", _plain("engine_type"))]
    rate = "rate_degC_per_1000_cycles"
    blocks: list[tuple[str, Sequence[Row], list[tuple[str, Cell]]]] = [
        (
            "What engines of a type have in common (environment 1, reference derate; degC, in brackets 95 %)",
            tables["margin_types"],
            [
                *kind,
                ("Rating", _plain("rating")),
                ("Engines", _plain("engines")),
                ("Readings", _plain("readings")),
                ("Lost per 1,000 cycles", _interval(rate, 1)),
                ("Table", _number("table_rate_degC_per_1000_cycles", 1)),
                ("Early loss", _interval("early_loss_degC", 1)),
                ("Table", _number("table_early_loss_degC", 1)),
                ("Wash gain", _interval("wash_gain_degC", 1)),
                ("Noise", _number("noise_degC", 1)),
            ],
        ),
        (
            "Margins now, the first to meet its removal margin first (degC, in brackets 95 %)",
            tables["margins"],
            [
                ("Engine", _plain("engine_serial")),
                ("Tail", _plain("tail")),
                ("Rating", _plain("rating")),
                ("Readings", _plain("readings")),
                ("Margin", _of("margin_degC", "margin_low_degC", "margin_high_degC", 1)),
                ("Lost per 1,000 cycles", _of(rate, "low", "high", 1)),
                ("Removal margin by: P10", _plain("date_p10")),
                ("P50", _plain("date_p50")),
                ("P90", _plain("date_p90")),
                ("Lasts summer, %", _number("lasts_summer_chance", 0, 100.0)),
                ("Note", _plain("note")),
            ],
        ),
        (
            "Jumps: visits, washes, swaps, and lasting steps",
            tables["steps"],
            [
                ("Engine", _plain("engine_serial")),
                ("Between", _plain("from_date")),
                ("and", _plain("to_date")),
                ("Gained, degC", _of("size_degC", "low", "high", 1)),
                ("Explained", _plain("explained")),
            ],
        ),
        (
            "Chance causes, environment 1 (in brackets 95 %)",
            tables["hazards"],
            [
                *kind,
                ("Module", _plain("module")),
                ("Cause", _plain("cause")),
                ("Run", _plain("run")),
                ("Failed", _plain("failures")),
                ("Other", _plain("censored")),
                ("Shape", _interval("shape", 2)),
                ("Scale", _interval("scale", 0)),
                ("Clock", _plain("clock")),
                ("Early, %", _interval("within_chance", 2, 100.0)),
                ("Best age", _number("best_age", 0)),
                ("Note", _plain("note")),
            ],
        ),
        (
            "Do removals come more or less often?",
            tables["trends"],
            [
                *kind,
                ("Cause", _plain("cause")),
                ("Failed", _plain("failures")),
                ("Since", _plain("from_date")),
                ("Shape", _interval("shape", 2)),
                ("Engine hours between, now", _interval("hours_between", 0)),
                ("Verdict", _plain("verdict")),
            ],
        ),
    ]
    if in_full:
        ahead: list[tuple[str, Cell]] = [
            ("Date", _plain("date")),
            ("Cycles", _plain("cycles_since_install")),
            ("Reading", _number("reading_degC", 1)),
            ("Fitted, degC", _of("margin_degC", "low", "high", 1)),
            ("Weight", _number("weight", 2)),
            ("Hottest ambient, degC", _number("hottest_ambient_degC", 1)),
        ]
        blocks.insert(2, ("Readings, and the margin ahead", tables["ahead"], ahead))
    return blocks


def _plain(name: str) -> Cell:
    return lambda row: "" if row[name] is None else row[name]


def _number(name: str, digits: int, factor: float = 1.0) -> Cell:
    return lambda row: "" if row[name] is None else f"{factor * row[name]:,.{digits}f}"


def _interval(name: str, digits: int, factor: float = 1.0) -> Cell:
    return _of(name, f"{name}_low", f"{name}_high", digits, factor)


def _of(name: str, low: str, high: str, digits: int, factor: float = 1.0) -> Cell:
    def end(value: float | None) -> str:
        return "?" if value is None else f"{factor * value:,.{digits}f}"

    def cell(row: Row) -> str:
        if row[name] is None and row[low] is None:
            return ""
        if row[low] is None and row[high] is None:
            return end(row[name])
        return f"{end(row[name])} ({end(row[low])} to {end(row[high])})"

    return cell
