"""Fleet: what is where, the weakest first."""

from __future__ import annotations

import streamlit as st

from planner.charts.fleet import engines_left
from planner.standing import spare_modules
from ui import data
from ui.widgets.tables import chart, show

st.title("Fleet")
st.write("What is where today, the weakest first: what each engine has left, what ends it, and what lies on the shelf.")

fleet, rows = data.fleet(), data.engines()
types = sorted({row["engine_type"] for row in rows})
chosen = st.segmented_control("Engine type", types, selection_mode="multi", default=types, key="fleet-types") or types
rows = [row for row in rows if row["engine_type"] in chosen]
wing = [row for row in rows if row["place"] == "wing"]
weak = [row for row in wing if row["state"] != "in order"]

first, second, third, fourth = st.columns(4)
first.metric("Aircraft", len({row["tail"] for row in wing}))
second.metric("Engines on the wing", len(wing))
third.metric("Weak or at a limit", len(weak))
fourth.metric("Spare engines ready", sum(row["place"] in ("spare", "leased in") for row in rows))

if wing:
    chart(
        engines_left(wing),
        words="Each mark is an engine on the wing; down and left is weak. Life is counted at the rating of its "
        "aircraft, rounded down; the margin is what the records say of its modules.",
    )
st.subheader("Engines")
show(rows, name="engines", height=420)
st.subheader("Spare modules")
shelf = [row for row in spare_modules(fleet) if row["engine_type"] in chosen]
if shelf:
    show(shelf, name="spare-modules")
else:
    st.info("No spare module is held.")
