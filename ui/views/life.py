"""Life left: what every part has left and why, who is hit by directives, whose serials are where, and the records."""

from __future__ import annotations

import datetime as dt
from pathlib import Path
from typing import Any

import streamlit as st

from planner import checking, life
from planner.charts.life import next_limits
from ui import data
from ui.widgets.tables import chart, show

_CHART_DAYS = 8 * 365  # further ahead a limit is no news


@st.cache_data(show_spinner="counting lives", max_entries=8)
def _lives(content: str, path: str, at: dt.date) -> dict[str, Any]:
    """Return the answer as plain rows; ``content`` is the key, so that records that change are read again."""
    found = life.lives(data.fleet(), at=at, inputs=content)
    names = ("parts", "engines", "directives", "places")
    return {name: [row._asdict() for row in getattr(found, name)] for name in names} | {"assumed": found.assumptions}


@st.cache_data(show_spinner="checking the records", max_entries=4)
def _problems(content: str, path: str) -> list[dict[str, Any]]:
    return [problem._asdict() for problem in checking.answer(Path(path)).problems]


st.title("Life left")
st.write("What every part has left at the rating it flies at, counted exactly and rounded down. Unknown life is zero.")

fleet = data.fleet()
as_of = fleet.settings.as_of
left, middle, right = st.columns(3)
at = left.date_input("On", as_of, min_value=as_of, max_value=as_of + dt.timedelta(days=7305), key="life-at")
tails = ["all", *sorted(aircraft.tail for aircraft in fleet.aircraft)]
tail = middle.selectbox("Aircraft", tails, key="life-tail")
states = right.multiselect("State", life.STATES, default=life.STATES, key="life-state")
answer = _lives(data.inputs(), str(data.fleet_path()), at if isinstance(at, dt.date) else as_of)


def _asked(row: dict[str, Any]) -> bool:
    return tail in ("all", row["tail"])


until = (at if isinstance(at, dt.date) else as_of) + dt.timedelta(days=_CHART_DAYS)
parts = [row for row in answer["parts"] if _asked(row) and row["state"] in states]
engines = [row for row in answer["engines"] if _asked(row) and row["state"] in states]
hit = [row for row in answer["directives"] if _asked(row)]

cells = st.columns(4)
for cell, state in zip(cells, life.STATES, strict=True):
    cell.metric(f"Parts {state}", sum(row["state"] == state for row in answer["parts"] if _asked(row)))

limits, directives, owners, records = st.tabs(["Limits", "Directives", "Owners and places", "Records"])
with limits:
    if any(row["date_reached"] is not None and row["date_reached"] <= until for row in parts):
        chart(
            next_limits([row for row in parts if row["date_reached"] is None or row["date_reached"] <= until]),
            words=f"Each mark is a part that must be off by {until}; left is soon. At a limit the answer is stop. "
            "Dates hold if every aircraft flies as planned and nothing is exchanged.",
        )
    st.subheader("Engines, weakest first")
    if engines:
        show(engines, name="life-engines", height=320)
    else:
        st.info("No engine is in this selection.")
    st.subheader("Parts, least life first")
    if parts:
        show(parts, name="life-parts", height=420, digits=3)
    else:
        st.info("No part is in this selection.")
with directives:
    st.write(
        "Parts whose limit a directive cuts: what is left before and after, and the day on which each must be off."
    )
    if hit:
        st.metric("Value of the life lost, USD", f"{sum(row['value_lost_usd'] for row in hit):,.0f}")
        show(hit, name="life-directives")
    else:
        st.info("No directive of the records hits a part in this selection.")
with owners:
    st.write("Modules and parts that are in another owner's assembly, and by when they must go back.")
    if answer["places"]:
        show(answer["places"], name="life-places")
    else:
        st.info("Every serial is in an assembly of its own owner.")
with records:
    st.write(
        "What the rules find in the records. A warning says what is assumed; what stops the work is shown instead."
    )
    problems = _problems(data.inputs(), str(data.fleet_path()))
    if problems:
        show(problems, name="problems", height=420)
    else:
        st.success("No problem found.")
for note in answer["assumed"]:
    st.text(f"Assumed: {note}")
