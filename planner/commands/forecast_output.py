"""The removals ahead as text to read, or as the JSON object."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Any

import click

from planner import fingerprint
from planner.assemble import load
from planner.commands.output import envelope, footer, print_json, table_text
from planner.execute import where_from
from planner.forecast import Forecast, ForecastRequest, forecast
from planner.forecast_months import ALL, SPANS
from planner.progress import Progress
from planner.stopping import stop_on_interrupt
from sim.fleet import Fleet

Row = dict[str, Any]
_SHOWN_ENGINES = 25  # the rest stands in --json and on the screen
_SHOWN_MONTHS = 24


def print_forecast(asked: Mapping[str, Any]) -> None:
    """Answer the question on standard output; progress of runs on standard error."""
    path = Path(asked["fleet"])
    fleet = load(path)
    inputs = fingerprint.folder(path)
    request = ForecastRequest(
        strategy=asked["strategy"],
        months=asked["months"],
        runs=asked["runs"],
        seed=asked["seed"],
        effects=asked["effects"],
        engine=asked["engine"],
        tail=asked["tail"],
    )
    progress = Progress(per_run=1)
    try:
        with stop_on_interrupt() as cancelled:
            where = where_from(asked["workers"], asked["cluster"])
            found = forecast(fleet, request, where=where, progress=progress, cancelled=cancelled)
    finally:
        progress.close()
    if asked["as_json"]:
        seed = request.seed if request.runs else None
        print_json(envelope("forecast", found.as_result(), inputs=inputs, warnings=found.warnings, seed=seed))
        return
    click.echo(text(found, fleet, inputs=inputs))


def text(found: Forecast, fleet: Fleet, *, inputs: str) -> str:
    """Return the answer as a page of text."""
    settings = fleet.settings
    head = f"{settings.fleet_name}{' (DEMO: invented data)' if settings.demo else ''}: removals ahead, "
    head += f"{found.request.months} months from {settings.as_of.isoformat()}, strategy {found.request.strategy}"
    blocks = [
        head,
        "\n".join(found.sentences),
        "Engines, the first to come off above\n" + _engines(found),
        "By month\n" + _months(found),
        "Within 12, 36 and 60 months\n" + _spans(found.spans),
        "What use does to the removals\n" + _effects(found.effects) if found.effects else "",
        footer(found.warnings, inputs=inputs, seed=found.request.seed if found.request.runs else None),
    ]
    return "\n\n".join(block for block in blocks if block)


def _engines(found: Forecast) -> str:
    causes: dict[str, list[str]] = {}
    for row in found.removals:
        name = f"{row['cause'].replace('_', ' ')} {row['module']}".strip()
        causes.setdefault(row["engine_serial"], []).append(f"{name} {_month(row['date_p50'])}")
    body = [
        [
            row["engine_serial"],
            row["tail"],
            _month(row["date_p10"]),
            _month(row["date_p50"]),
            _month(row["date_p90"]),
            f"{row['summer_chance']:.0%}",
            "; ".join(causes.get(row["engine_serial"], [])),
        ]
        for row in found.engines[:_SHOWN_ENGINES]
    ]
    table = table_text(
        ["engine", "tail", "P10", "P50", "P90", "lasts the summer", "first three causes (P50)"], body, right=(5,)
    )
    rest = len(found.engines) - len(body)
    return table + (f"\n… and {rest} more (see --json)" if rest > 0 else "")


def _month(value: Any) -> str:
    return "never" if value is None else f"{value:%Y-%m}"


def _months(found: Forecast) -> str:
    simulated = any(row["removals_simulated"] is not None for row in found.months)
    headings = ["type", "month", "removals", "P10-P90", "away", "spares", "chance short", "slots needed", "slots"]
    body = []
    for row in found.months:
        if (row["month"].year - found.months[0]["month"].year) * 12 + row["month"].month - found.months[0][
            "month"
        ].month >= _SHOWN_MONTHS:
            continue
        cells = [
            row["engine_type"],
            f"{row['month']:%Y-%m}",
            f"{row['removals']:.2f}",
            f"{row['removals_p10']}-{row['removals_p90']}",
            f"{row['away']:.1f}",
            row["spares"],
            f"{row['short_chance']:.0%}",
            f"{row['slots_needed']:.1f}",
            "no bound" if row["slots"] is None else f"{row['slots']:.1f}",
        ]
        if simulated:
            cells += [f"{row['removals_simulated']:.2f}", f"{row['short_chance_simulated']:.0%}"]
        body.append(cells)
    if simulated:
        headings += ["removals simulated", "short simulated"]
    return table_text(headings, body, right=range(2, 99))


def _spans(rows: list[Row]) -> str:
    by: dict[tuple[str, str], dict[int, str]] = {}
    for row in rows:
        cell = f"{row['removals']:.1f} ({row['removals_p10']}-{row['removals_p90']})"
        by.setdefault((row["engine_type"], row["cause"]), {})[row["months"]] = cell
    ordered = sorted(by, key=lambda key: (key[0], key[1] != ALL, key[1]))
    body = [[*key, *(by[key].get(months, "") for months in SPANS)] for key in ordered]
    return table_text(["type", "cause", *(f"{m} months (P10-P90)" for m in SPANS)], body, right=range(2, 99))


def _effects(rows: list[Row]) -> str:
    def cell(value: float | None, sign: str = "") -> str:
        return "" if value is None else f"{value:{sign}.1f}"

    body = [
        [
            row["engine_type"],
            row["change"],
            *(cell(row[f"removals_{m}"]) for m in SPANS),
            cell(row["difference_60"], "+"),
        ]
        for row in rows
    ]
    return table_text(["type", "change", *(f"{m} months" for m in SPANS), "change in 60"], body, right=range(2, 99))
