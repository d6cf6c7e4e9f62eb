"""Saved runs: every study kept on this machine, and what it said."""

from __future__ import annotations

import streamlit as st

from planner.home import home
from planner.store import studies
from sim.errors import UserError
from ui.widgets import study as shown
from ui.widgets.tables import show

st.title("Saved runs")
st.write("Every study is saved under a name that follows from what went in; the same inputs give the same figures.")
try:
    found = studies(home())
except (UserError, OSError) as error:
    found = []
    st.error("The store cannot be read:")
    st.text(str(error))
if not found:
    st.info("Nothing is saved yet: run a comparison on the page Strategies.")
else:
    rows = [
        {
            "study": one.id,
            "made_at": one.made_at,
            "command": one.command,
            "strategies": ", ".join(one.strategies),
            "runs": one.runs,
            "seed": one.seed,
            "finished": "yes" if one.finished else "no",
            "inputs": one.inputs[:12],
            "version": one.version,
        }
        for one in found
    ]
    show(rows, name="saved-runs")
    names = [one.id for one in found]
    chosen = st.selectbox("Open a study", names, index=None, placeholder="choose a study")
    if chosen:
        one = found[names.index(chosen)]
        if one.command == "compare":
            shown.results(
                {
                    "result": one.summary,
                    "warnings": list(one.warnings),
                    "seed": one.seed,
                    "version": one.version,
                    "inputs": one.inputs,
                    "study": one.id,
                }
            )
        else:
            st.json(one.summary)
