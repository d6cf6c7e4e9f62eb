"""Charts of fitted records: an engine's margin over time with readings, fit, steps and band, and a cause's ages."""

from __future__ import annotations

import math
from typing import Any

import altair as alt
import numpy as np
import pandas as pd

from planner.charts.palette import NEUTRAL, SERIES, STOP, WARN

Rows = list[dict[str, Any]]

_READING, _OUTLIER, _STEP = "reading", "outlier", "step"
OUTLIER_WEIGHT = 0.07


def trend(ahead: Rows, *, steps: Rows, removal_margin_degC: float, title: str = "Margin over time") -> alt.LayerChart:
    """Return one engine's readings with the fit and its band, seen and to come, steps, and the removal margin.

    ``ahead``: rows of margin_ahead; ``steps``: rows of margin_steps of the same engine.
    """
    frame = pd.DataFrame(ahead)
    frame["date"] = pd.to_datetime(frame["date"])
    frame["part"] = np.where(frame["reading_degC"].notna(), "fitted to readings", "carried forward")
    # the line goes on without a gap: what is carried forward begins at the last fitted point
    last = frame[frame["part"] == "fitted to readings"].tail(1).assign(part="carried forward")
    frame = pd.concat([frame, last]).sort_values("date")
    x = alt.X("date:T", title="date", axis=alt.Axis(format="%b %Y", labelOverlap=True))
    parts = ["fitted to readings", "carried forward"]
    shade = alt.Color("part:N", title="fit", scale=alt.Scale(domain=parts, range=[SERIES[0], SERIES[1]]))
    dash = alt.StrokeDash("part:N", title="fit", scale=alt.Scale(domain=parts, range=[[1, 0], [6, 3]]))
    band = (
        alt.Chart(frame)
        .mark_area(opacity=0.22)
        .encode(x=x, y=alt.Y("low:Q", title="hot-day EGT margin, degC"), y2="high:Q", color=shade)
    )
    line = (
        alt.Chart(frame)
        .mark_line(strokeWidth=2)
        .encode(
            x=x,
            y="margin_degC:Q",
            color=shade,
            strokeDash=dash,
            tooltip=[
                alt.Tooltip("date:T"),
                alt.Tooltip("margin_degC:Q", title="fitted, degC", format=".1f"),
                alt.Tooltip("low:Q", format=".1f"),
                alt.Tooltip("high:Q", format=".1f"),
            ],
        )
    )
    return alt.layer(band, line, *_readings(frame), *_steps(steps), *_removal(removal_margin_degC)).properties(
        title=title, height=320
    )


def _readings(frame: pd.DataFrame) -> list[alt.Chart]:
    """Return the readings, outliers as crosses."""
    seen = frame[frame["reading_degC"].notna() & (frame["part"] == "fitted to readings")].copy()
    seen["kind"] = np.where(seen["weight"] < OUTLIER_WEIGHT, _OUTLIER, _READING)
    kinds = [_READING, _OUTLIER]
    return [
        alt.Chart(seen)
        .mark_point(size=46, filled=False, color=NEUTRAL, strokeWidth=1.4)
        .encode(
            x="date:T",
            y="reading_degC:Q",
            shape=alt.Shape("kind:N", title="readings", scale=alt.Scale(domain=kinds, range=["circle", "cross"])),
            tooltip=[
                alt.Tooltip("date:T"),
                alt.Tooltip("reading_degC:Q", title="reading, degC", format=".1f"),
                alt.Tooltip("weight:Q", title="weight", format=".2f"),
            ],
        )
    ]


def _steps(steps: Rows) -> list[alt.Chart]:
    """Return a rule and a label for each step, at its first reading after it."""
    if not steps:
        return []
    frame = pd.DataFrame(steps)
    frame["to_date"] = pd.to_datetime(frame["to_date"])
    frame["from_date"] = [day.isoformat() for day in frame["from_date"]]
    frame["label"] = [f"step {size:+.0f} degC" for size in frame["size_degC"]]
    rule = (
        alt.Chart(frame)
        .mark_rule(color=WARN, strokeDash=[2, 2], strokeWidth=1.5)
        .encode(
            x="to_date:T",
            tooltip=[
                alt.Tooltip("label:N", title="step"),
                alt.Tooltip("from_date:N", title="after"),
                alt.Tooltip("to_date:T", title="before"),
                alt.Tooltip("explained:N"),
            ],
        )
    )
    words = (
        alt.Chart(frame)
        .mark_text(align="left", dx=4, baseline="top", color=WARN)
        .encode(x="to_date:T", y=alt.value(4), text="label:N")
    )
    return [rule, words]


def _removal(margin_degC: float) -> list[alt.Chart]:
    frame = pd.DataFrame([{"margin": margin_degC, "label": f"removal margin {margin_degC:g} degC"}])
    rule = alt.Chart(frame).mark_rule(color=STOP, strokeWidth=1.5).encode(y="margin:Q")
    words = (
        alt.Chart(frame)
        .mark_text(align="left", dx=4, dy=-6, color=STOP)
        .encode(x=alt.value(0), y="margin:Q", text="label:N")
    )
    return [rule, words]


def failing(hazards: Rows, *, title: str = "Chance to have failed by age") -> alt.Chart:
    """Return the chance to have failed by age for fitted hazards on one clock (rows of hazards_fitted with a scale)."""
    clock = hazards[0]["clock"] if hazards else "cycles"
    shown = [row for row in hazards if row["scale"] is not None and row["clock"] == clock]
    reach = max((row["scale"] for row in shown), default=1.0) * 1.3
    points = [
        {
            "cause": f"{row['engine_type']} {row['module']}, {row['cause']} ({row['run']})",
            "age": reach * i / 60.0,
            "chance": 100.0 * -math.expm1(-((reach * i / 60.0 / row["scale"]) ** row["shape"])),
        }
        for row in shown
        for i in range(61)
    ]
    names = list(dict.fromkeys(point["cause"] for point in points))
    return (
        alt.Chart(pd.DataFrame(points, columns=["cause", "age", "chance"]), title=title, height=260)
        .mark_line(strokeWidth=2)
        .encode(
            x=alt.X("age:Q", title=clock),
            y=alt.Y("chance:Q", title="failed, %", scale=alt.Scale(domain=[0, 100])),
            color=alt.Color(
                "cause:N",
                title=None,
                scale=alt.Scale(domain=names, range=[SERIES[i % len(SERIES)] for i in range(len(names))]),
                legend=alt.Legend(orient="bottom", columns=2, labelLimit=320),
            ),
            strokeDash=alt.StrokeDash("cause:N", title=None, legend=None),
            tooltip=["cause:N", alt.Tooltip("age:Q", format=",.0f"), alt.Tooltip("chance:Q", format=".1f")],
        )
    )
