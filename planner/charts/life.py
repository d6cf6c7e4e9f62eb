"""What is left: the next hard limits on a line of dates."""

from __future__ import annotations

from typing import Any

import altair as alt
import pandas as pd

from planner.charts.palette import GOOD, NEUTRAL, SHAPES, STOP, WARN

STATES = ("at limit", "near limit", "unknown", "clear")
_MOST_MARKS = 2_000


def next_limits(rows: list[dict[str, Any]]) -> alt.Chart:
    """Return parts by the date on which each must be off against cycles left; state by colour and shape.

    ``rows`` are those of the output table ``life_parts``; parts without a date (off a tail) are left out, and of very
    many the latest.
    """
    dated = sorted((row for row in rows if row["date_reached"] is not None), key=lambda row: row["date_reached"])
    frame = pd.DataFrame(dated[:_MOST_MARKS], columns=list(rows[0]) if rows else None)
    if len(frame):
        frame["date_reached"] = pd.to_datetime(frame["date_reached"])
    return (
        alt.Chart(frame, title="When each part must be off, at planned use", height=320)
        .mark_point(filled=True, size=60, opacity=0.8)
        .encode(
            x=alt.X("date_reached:T", title="must be off by"),
            y=alt.Y("cycles_left:Q", title="cycles left"),
            color=alt.Color(
                "state:N", scale=alt.Scale(domain=list(STATES), range=[STOP, WARN, NEUTRAL, GOOD]), title="state"
            ),
            shape=alt.Shape(
                "state:N",
                scale=alt.Scale(domain=list(STATES), range=["cross", SHAPES[2], SHAPES[1], SHAPES[0]]),
                title="state",
            ),
            tooltip=[
                alt.Tooltip("part_serial:N", title="part"),
                alt.Tooltip("engine_serial:N", title="engine"),
                alt.Tooltip("tail:N", title="tail"),
                alt.Tooltip("cycles_left:Q", title="cycles left", format=","),
                alt.Tooltip("date_reached:T", title="must be off by", format="%Y-%m-%d"),
                alt.Tooltip("limit_source:N", title="limit's source"),
            ],
        )
    )
