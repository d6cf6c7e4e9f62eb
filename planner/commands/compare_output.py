"""A comparison as text to read, or as the JSON object."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any

import click

from planner.answering import Answered
from planner.commands.output import envelope, footer, print_json, table_text
from planner.compare import BASIS


def print_comparison(done: Answered, *, as_json: bool, fleet: Path) -> None:
    """Print the answer on standard output."""
    seed = done.study.request.seed
    if as_json:
        result = {**done.comparison.as_result(), "study": done.saved}
        body = envelope("compare", result, inputs=done.inputs, warnings=done.warnings, seed=seed, basis=BASIS)
        print_json(body)
        return
    click.echo(text(done, fleet))


def text(done: Answered, fleet: Path) -> str:
    """Return the answer as a page of text."""
    scenario = next(iter(done.study.scenarios.values()))
    settings = scenario.fleet.settings
    head = f"{settings.fleet_name}{' (DEMO: invented data)' if settings.demo else ''}"
    answer = done.comparison
    blocks = [
        f"{head}: {len(scenario.fleet.aircraft)} aircraft, {len(scenario.fleet.engines)} engines, "
        f"{scenario.horizon_days / 365.25:g} years, {answer.runs} runs ({_stopped(answer.stopped)})",
        "\n".join(answer.sentences),
        "Cost in present value, M USD (consumption basis: cash and the value of life used)\n"
        + _strategies(answer.strategies),
        "Differences, M USD\n" + _differences(answer.differences),
        "Cost by line, M USD\n" + _by_line(answer.costs),
        "Aircraft-days lost by reason\n" + _pivot(answer.downtime, "reason", "aircraft_days_mean", 1),
        "Removals by cause\n" + _pivot(answer.removals, "cause", "removals_mean", 1),
        "Cheapest by horizon and basis\n" + _sweep(answer.sweep),
        footer(done.warnings, inputs=done.inputs, seed=done.study.request.seed),
    ]
    if done.saved:
        blocks.append(f"Saved as {done.saved}; see it again with: spoolwright runs show {done.saved}")
    if done.study.kept_runs:
        blocks.append(f"{done.study.kept_runs} finished runs were found and not simulated again.")
    blocks.append(f"Open the screen with: spoolwright serve {fleet}")
    return "\n\n".join(block for block in blocks if block)


def _stopped(reason: str) -> str:
    return {
        "precise": "the interval is as narrow as asked",
        "sign": "the sign of every difference is clear",
        "most": "the most runs allowed; the asked precision was not reached",
        "fixed": "as many as asked",
        "cancelled": "stopped by hand",
    }.get(reason, reason)


def _m(value: float | None, digits: int = 2) -> str:
    return "" if value is None else f"{value / 1e6:,.{digits}f}"


def _n(value: float | None, digits: int = 1) -> str:
    return "" if value is None else f"{value:,.{digits}f}"


def _strategies(rows: list[dict[str, Any]]) -> str:
    lines: tuple[tuple[str, Callable[[dict[str, Any]], str]], ...] = (
        ("total mean", lambda r: _m(r["total_usd_mean"])),
        ("total P10", lambda r: _m(r["total_usd_p10"])),
        ("total P50", lambda r: _m(r["total_usd_p50"])),
        ("total P90", lambda r: _m(r["total_usd_p90"])),
        ("cash mean", lambda r: _m(r["cash_usd_mean"])),
        ("USD an engine hour flown", lambda r: _n(r["usd_per_engine_hour_mean"])),
        ("USD an engine hour planned", lambda r: _n(r["usd_per_planned_hour_mean"])),
        ("USD a cycle", lambda r: _n(r["usd_per_cycle_mean"])),
        ("aircraft-days lost", lambda r: _n(r["aircraft_days_lost_mean"])),
        ("removals", lambda r: _n(r["removals_mean"])),
        ("modules exchanged", lambda r: _n(r["exchanges_mean"])),
        ("hours on the wing", lambda r: _n(r["time_on_wing_hours_mean"], 0)),
        ("waits for an engine", lambda r: _n(r["shortages_mean"])),
        ("engines leased in", lambda r: _n(r["leased_in_mean"])),
        ("stub, cycles a part", lambda r: _n(r["stub_cycles_mean"], 0)),
        ("wear fuel, t", lambda r: _n(r["fuel_kg_mean"] / 1000.0, 0)),
        ("CO2 of wear, t", lambda r: _n(r["co2_kg_mean"] / 1000.0, 0)),
    )
    names = [r["strategy"] for r in rows]
    return table_text(["", *names], [[label, *(cell(r) for r in rows)] for label, cell in lines], right=range(1, 99))


def _differences(rows: list[dict[str, Any]]) -> str:
    return table_text(
        ["a less b", "mean", "95 % from", "to", "a cheaper in"],
        [
            [
                f"{r['a']} less {r['b']}",
                _m(r["total_usd_mean"]),
                _m(r["total_usd_low"]),
                _m(r["total_usd_high"]),
                f"{r['cheaper_chance']:.0%} of runs",
            ]
            for r in rows
        ],
        right=range(1, 99),
    )


def _sum(rows: list[dict[str, Any]], key: str, value: str) -> dict[str, dict[str, float]]:
    found: dict[str, dict[str, float]] = {}
    for row in rows:
        by = found.setdefault(row[key], {})
        by[row["strategy"]] = by.get(row["strategy"], 0.0) + row[value]
    return found


def _by_line(rows: list[dict[str, Any]]) -> str:
    names = list(dict.fromkeys(r["strategy"] for r in rows))
    lines = _sum(rows, "line", "usd_mean")
    body = [[line.replace("_", " "), *(_m(by.get(n, 0.0)) for n in names)] for line, by in lines.items()]
    body.append(["total", *(_m(sum(by.get(n, 0.0) for by in lines.values())) for n in names)])
    return table_text(["", *names], body, right=range(1, 99))


def _pivot(rows: list[dict[str, Any]], key: str, value: str, digits: int) -> str:
    names = list(dict.fromkeys(r["strategy"] for r in rows))
    body = [
        [str(what).replace("_", " "), *(_n(by.get(n, 0.0), digits) for n in names)]
        for what, by in _sum(rows, key, value).items()
    ]
    return table_text(["", *names], body, right=range(1, 99))


def _sweep(rows: list[dict[str, Any]]) -> str:
    seen: dict[float, dict[str, str]] = {}
    for row in rows:
        seen.setdefault(row["horizon_years"], {})[row["basis"]] = row["cheapest"]
    return table_text(
        ["years", "consumption", "cash alone"],
        [[f"{years:g}", by.get("consumption", ""), by.get("cash", "")] for years, by in seen.items()],
    )


def print_story(asked: Mapping[str, Any]) -> None:
    """Print one serial's dated history in run 0 of each strategy asked for."""
    from planner.assemble import load
    from planner.comparing import request_of
    from planner.story import story
    from planner.study import scenarios

    found, _ = scenarios(load(Path(asked["fleet"])), request_of(asked))
    stories = {name: story(scenario, name, asked["story"]) for name, scenario in found.items()}
    if asked["as_json"]:
        from planner import fingerprint

        rows = [
            {"strategy": name, "from_date": a, "to_date": b, "what": words}
            for name, lines in stories.items()
            for a, b, words in lines
        ]
        inputs = fingerprint.folder(Path(asked["fleet"]))
        print_json(envelope("compare", {"story": rows}, inputs=inputs, seed=asked["seed"]))
        return
    for name, lines in stories.items():
        click.echo(f"{asked['story']} under {name}, run 0, seed {asked['seed']}")
        for a, b, words in lines:
            when = a.isoformat() if a == b else f"{a.isoformat()} to {b.isoformat()}"
            click.echo(f"  {when:24s}  {words}")
        click.echo()
