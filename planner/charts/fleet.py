"""Where the fleet stands: engines by what they have left."""

from __future__ import annotations

from typing import Any

import altair as alt
import pandas as pd

from planner.charts.palette import GOOD, SHAPES, STOP, WARN

STATES = ("at limit or unknown", "weak", "in order")


def engines_left(rows: list[dict[str, Any]]) -> alt.Chart:
    """Return engines by cycles left on the part that limits against margin; state by colour and shape."""
    frame = pd.DataFrame(rows)
    return (
        alt.Chart(frame, title="Engines on the wing: life left against margin", height=360)
        .mark_point(filled=True, size=80, opacity=0.85)
        .encode(
            x=alt.X("cycles_left:Q", title="cycles left on the part that limits"),
            y=alt.Y("margin_degC:Q", title="hot-day EGT margin, degC"),
            color=alt.Color("state:N", scale=alt.Scale(domain=list(STATES), range=[STOP, WARN, GOOD]), title="state"),
            shape=alt.Shape(
                "state:N", scale=alt.Scale(domain=list(STATES), range=["cross", SHAPES[2], SHAPES[0]]), title="state"
            ),
            tooltip=[
                alt.Tooltip("engine_serial:N", title="engine"),
                alt.Tooltip("tail:N"),
                alt.Tooltip("cycles_left:Q", title="cycles left", format=","),
                alt.Tooltip("limited_by:N", title="limited by"),
                alt.Tooltip("margin_degC:Q", title="margin, degC", format=".1f"),
            ],
        )
    )
