"""Charts of a comparison: pure functions from rows of an answer to a chart."""

from __future__ import annotations

from typing import Any

import altair as alt
import pandas as pd

from planner.charts.palette import DASHES, NEUTRAL, SERIES, SHAPES
from sim.pricing import VALUE_LINES

Rows = list[dict[str, Any]]
_GROUPS = {
    "work": "work and findings",
    "findings": "work and findings",
    "parts": "life-limited parts",
    "access": "access, level, test, moves",
    "engine_level": "access, level, test, moves",
    "test": "access, level, test, moves",
    "transport": "access, level, test, moves",
    "engine_change": "engine changes, exchanges",
    "exchange": "engine changes, exchanges",
    "call_out": "engine changes, exchanges",
    "downtime": "aircraft out of service",
    "lease_in": "engines leased in",
    "wear_fuel": "fuel of wear, washes",
    "wear_co2": "fuel of wear, washes",
    "wash": "fuel of wear, washes",
}
_REST = "keeping, reserves, settlements"
_VALUE = "value of life and stock used"


def _names(rows: Rows, key: str = "strategy") -> list[str]:
    return list(dict.fromkeys(str(row[key]) for row in rows))


def _scale(names: list[str]) -> alt.Scale:
    return alt.Scale(domain=names, range=[SERIES[i % len(SERIES)] for i in range(len(names))])


def costs_by_line(costs: Rows) -> alt.Chart:
    """Return stacked bars of present cost by group of lines, one bar a strategy."""
    frame = pd.DataFrame(costs)
    frame["group"] = [_VALUE if line in VALUE_LINES else _GROUPS.get(line, _REST) for line in frame["line"]]
    table = frame.groupby(["strategy", "group"], sort=False, as_index=False)["usd_mean"].sum()
    table["million"] = table["usd_mean"] / 1e6
    order = [*dict.fromkeys(_GROUPS.values()), _REST, _VALUE]
    return (
        alt.Chart(table, title="Present cost by group of lines", height=alt.Step(52))
        .mark_bar(stroke="white", strokeWidth=0.6)
        .encode(
            x=alt.X("million:Q", title="present cost, M USD", stack="zero"),
            y=alt.Y("strategy:N", title=None, sort=_names(costs)),
            color=alt.Color(
                "group:N", title="lines", sort=order, scale=_scale(order), legend=alt.Legend(orient="bottom", columns=3)
            ),
            order=alt.Order("rank:Q"),
            tooltip=[
                alt.Tooltip("strategy:N"),
                alt.Tooltip("group:N", title="lines"),
                alt.Tooltip("million:Q", title="M USD", format=",.2f"),
            ],
        )
        .transform_calculate(rank=f"indexof({order}, datum.group)")
    )


def cumulative_cash(cash: Rows) -> alt.Chart:
    """Return cumulative present cash by year, a line with its own dash and shape for each strategy."""
    frame = pd.DataFrame(cash)
    frame["million"] = frame.groupby("strategy", sort=False)["usd_mean"].cumsum() / 1e6
    names = _names(cash)
    dashes = alt.Scale(domain=names, range=[list(DASHES[i % len(DASHES)]) for i in range(len(names))])
    shapes = alt.Scale(domain=names, range=[SHAPES[i % len(SHAPES)] for i in range(len(names))])
    base = alt.Chart(frame, title="Cumulative cash", height=280).encode(
        x=alt.X("year:O", title="calendar year"),
        y=alt.Y("million:Q", title="present cash, M USD"),
        color=alt.Color("strategy:N", scale=_scale(names), title="strategy"),
        tooltip=[
            alt.Tooltip("strategy:N"),
            alt.Tooltip("year:O"),
            alt.Tooltip("million:Q", title="M USD so far", format=",.1f"),
        ],
    )
    lines = base.mark_line(strokeWidth=2.5).encode(
        strokeDash=alt.StrokeDash("strategy:N", scale=dashes, title="strategy")
    )
    points = base.mark_point(filled=True, size=55).encode(shape=alt.Shape("strategy:N", scale=shapes, title="strategy"))
    return alt.layer(lines, points)


def downtime_by_reason(downtime: Rows) -> alt.Chart:
    """Return aircraft-days lost by reason, grouped by strategy."""
    return _grouped(downtime, "reason", "aircraft_days_mean", "Aircraft-days lost", "aircraft-days over the horizon")


def removals_by_cause(removals: Rows) -> alt.Chart:
    """Return removals by cause, grouped by strategy, over all types."""
    frame = pd.DataFrame(removals).groupby(["strategy", "cause"], sort=False, as_index=False)["removals_mean"].sum()
    rows: Rows = [
        {"strategy": strategy, "cause": cause, "removals_mean": count}
        for strategy, cause, count in frame.itertuples(index=False)
    ]
    return _grouped(rows, "cause", "removals_mean", "Removals by cause", "removals over the horizon")


def _grouped(rows: Rows, key: str, value: str, title: str, axis: str) -> alt.Chart:
    frame = pd.DataFrame(rows)
    names = _names(rows)
    return (
        alt.Chart(frame, title=title, height=280)
        .mark_bar()
        .encode(
            y=alt.Y(f"{key}:N", title=None, sort=_names(rows, key)),
            yOffset=alt.YOffset("strategy:N", sort=names),
            x=alt.X(f"{value}:Q", title=axis),
            color=alt.Color("strategy:N", scale=_scale(names), title="strategy"),
            tooltip=[
                alt.Tooltip("strategy:N"),
                alt.Tooltip(f"{key}:N"),
                alt.Tooltip(f"{value}:Q", title=axis, format=",.1f"),
            ],
        )
    )


def difference_spread(samples: Rows, a: str, b: str) -> alt.Chart:
    """Return the histogram of the difference of two strategies over runs, with zero and the mean marked."""
    frame = pd.DataFrame([row for row in samples if row["a"] == a and row["b"] == b])
    frame["million"] = frame["total_usd"] / 1e6
    bars = (
        alt.Chart(frame, title=f"{a} less {b}: total cost of each run", height=240)
        .mark_bar(color=SERIES[0], stroke="white", strokeWidth=0.5)
        .encode(
            x=alt.X("million:Q", bin=alt.Bin(maxbins=24), title=f"M USD (right of zero: {a} costs more)"),
            y=alt.Y("count():Q", title="runs"),
            tooltip=[
                alt.Tooltip("million:Q", bin=alt.Bin(maxbins=24), title="M USD"),
                alt.Tooltip("count():Q", title="runs"),
            ],
        )
    )
    marks = pd.DataFrame({"at": [0.0, float(frame["million"].mean())], "mark": ["zero", "mean"]})
    rules = (
        alt.Chart(marks)
        .mark_rule(strokeWidth=2)
        .encode(
            x="at:Q",
            strokeDash=alt.StrokeDash(
                "mark:N", scale=alt.Scale(domain=["zero", "mean"], range=[[1, 0], [5, 4]]), title="line"
            ),
            color=alt.Color(
                "mark:N", scale=alt.Scale(domain=["zero", "mean"], range=[NEUTRAL, SERIES[1]]), title="line"
            ),
            tooltip=[alt.Tooltip("mark:N"), alt.Tooltip("at:Q", title="M USD", format=",.2f")],
        )
    )
    return alt.layer(bars, rules)
