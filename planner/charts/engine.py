"""Charts of an engine type: what a point costs, margin against ambient, the worth of work."""

from __future__ import annotations

from typing import Any

import altair as alt
import pandas as pd

from planner.charts.palette import DASHES, NEUTRAL, SERIES, STOP

Rows = list[dict[str, Any]]

_CHANGES = {
    "efficiency": "one point of efficiency",
    "flow_capacity": "1 % of flow capacity",
    "pressure_loss": "one point of pressure loss",
    "throat_area": "1 % more throat",
}


def _coefficients(rows: Rows, *, figure: str, factor: float, title: str, axis: str) -> alt.LayerChart:
    """Return bars with the band as a line, components in the order of the gas path."""
    frame = pd.DataFrame(
        [
            {
                "place": f"{row['module']}: {row['component']}" if row["module"] != row["component"] else row["module"],
                "change": _CHANGES[row["change"]],
                "value": factor * row[figure],
                "low": factor * row[f"{figure}_low"],
                "high": factor * row[f"{figure}_high"],
            }
            for row in rows
        ]
    )
    order, changes = list(dict.fromkeys(frame["place"])), list(_CHANGES.values())
    base = alt.Chart(frame).encode(
        y=alt.Y("place:N", sort=order, title=None, axis=alt.Axis(labelLimit=220)),
        yOffset=alt.YOffset("change:N", sort=changes),
        tooltip=[
            alt.Tooltip("place:N", title="component"),
            alt.Tooltip("change:N", title="for"),
            alt.Tooltip("value:Q", title=axis, format="+.2f"),
            alt.Tooltip("low:Q", format="+.2f"),
            alt.Tooltip("high:Q", format="+.2f"),
        ],
    )
    bars = base.mark_bar(stroke=NEUTRAL, strokeWidth=0.5).encode(
        x=alt.X("value:Q", title=axis),
        color=alt.Color(
            "change:N",
            title=None,
            scale=alt.Scale(domain=changes, range=list(SERIES[: len(changes)])),
            legend=alt.Legend(orient="bottom", columns=2, symbolLimit=0, labelLimit=300),
        ),
    )
    bands = base.mark_rule(strokeWidth=1.5, color=NEUTRAL).encode(x="low:Q", x2="high:Q")
    return alt.layer(bars, bands, title=title).properties(height=alt.Step(14))


def heat(rows: Rows) -> alt.LayerChart:
    """Return degrees of EGT for one point lost in each component, with bands."""
    return _coefficients(
        rows, figure="egt_K", factor=1.0, title="EGT for one point lost", axis="degC hotter at take-off, hot day"
    )


def fuel(rows: Rows) -> alt.LayerChart:
    """Return percent of cruise fuel for one point lost in each component, with bands."""
    return _coefficients(
        rows, figure="fuel_cruise_frac", factor=100.0, title="Cruise fuel for one point lost", axis="% more fuel"
    )


def ambient(rows: Rows, *, removal_margin_degC: float, corner_point_degC: float) -> alt.LayerChart:
    """Return the margin of a new engine against ambient temperature, a line a rating."""
    frame = pd.DataFrame(rows)
    ratings = list(dict.fromkeys(frame["rating"]))
    lines = (
        alt.Chart(frame)
        .mark_line(point=True)
        .encode(
            x=alt.X("ambient_degC:Q", title="ambient temperature at sea level, degC"),
            y=alt.Y("margin_degC:Q", title="EGT margin, degC"),
            color=alt.Color("rating:N", scale=alt.Scale(domain=ratings, range=list(SERIES[: len(ratings)]))),
            strokeDash=alt.StrokeDash(
                "rating:N", scale=alt.Scale(domain=ratings, range=[list(DASHES[i % 4]) for i in range(len(ratings))])
            ),
            tooltip=["rating:N", "ambient_degC:Q", alt.Tooltip("margin_degC:Q", format=".0f")],
        )
    )
    rules = pd.DataFrame([{"margin": 0.0, "what": "redline"}, {"margin": removal_margin_degC, "what": "comes off"}])
    level = alt.Chart(rules).mark_rule(color=STOP, strokeDash=[4, 3]).encode(y="margin:Q", tooltip=["what:N"])
    corner = (
        alt.Chart(pd.DataFrame([{"at": corner_point_degC}]))
        .mark_rule(color=NEUTRAL)
        .encode(x="at:Q", tooltip=[alt.Tooltip("at:Q", title="corner point")])
    )
    return alt.layer(lines, level, corner, title="Margin of a new engine at full rated thrust").properties(height=320)


def worth(rows: Rows) -> alt.HConcatChart:
    """Return what restoring a module buys for a million: degrees of margin, and fuel a year."""
    frame = pd.DataFrame(
        [
            {
                "module": row["module"],
                "level": row["level"],
                "degrees": row["regained_degC"] / row["cost_usd"] * 1e6,
                "fuel": row["fuel_usd_per_year"] / row["cost_usd"] * 1e6 / 1e3,
            }
            for row in rows
            if row["cost_usd"] and row["regained_degC"] > 0.0
        ],
        columns=["module", "level", "degrees", "fuel"],
    )
    levels = list(dict.fromkeys(frame["level"]))

    def bars(field: str, title: str) -> alt.Chart:
        return (
            alt.Chart(frame, title=title, height=alt.Step(16), width=300)
            .mark_bar()
            .encode(
                x=alt.X(f"{field}:Q", title=None),
                y=alt.Y("module:N", sort=None, title=None),
                yOffset=alt.YOffset("level:N", sort=levels),
                color=alt.Color(
                    "level:N", scale=alt.Scale(domain=levels, range=list(SERIES[: len(levels)])), sort=levels
                ),
                tooltip=["module:N", "level:N", alt.Tooltip(f"{field}:Q", title=title, format=",.1f")],
            )
        )

    return alt.hconcat(
        bars("degrees", "degC regained for 1 M USD"), bars("fuel", "fuel saved a year for 1 M USD, thousand USD")
    )
