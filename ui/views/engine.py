"""Engine: what a point lost costs in margin and fuel, what work and spare modules bring back, margins over time."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import streamlit as st

from planner import fit
from planner.charts import engine as charts
from planner.charts import fit as fit_charts
from planner.engine_fleet import FleetAnswer, ask
from planner.fitting import Fitting
from planner.module_worth import Exchange, spare_on_engine
from planner.standing import spare_modules
from sim.errors import UserError
from sim.fleet import Fleet
from ui import data
from ui.widgets.tables import chart, show


@st.cache_data(show_spinner="computing the gas path", max_entries=8)
def _answer(content: str, path: str, engine_type: str) -> FleetAnswer:
    del content  # the key: records that change are computed again
    return ask(Path(path), engine_type=engine_type)


@st.cache_data(show_spinner="fitting the readings", max_entries=2)
def _fitted(content: str, path: str) -> tuple[dict[str, list[dict[str, Any]]], list[str]]:
    del content  # the key, as above
    found = fit.ask(Path(path))
    return {name: found.tables[name] for name in ("margins", "margin_types", "steps", "ahead")}, found.warnings


def _percent(row: dict[str, Any]) -> dict[str, Any]:
    """Return a coefficient with its shares in percent, as they are read."""
    return {name.replace("frac", "percent"): 100.0 * value if "_frac" in name else value for name, value in row.items()}


def _physics(found: FleetAnswer, fleet: Fleet, name: str) -> None:
    """Show what a point costs, and margin against ambient temperature and rating."""
    kind = next(row for row in fleet.engine_types if row.engine_type == name)
    rows = found.tables["coefficients"]
    left, right = st.columns(2)
    with left:
        chart(
            charts.heat(rows),
            words="Take-off EGT at full rated thrust on the corner-point day; the line is the band of the unknown.",
        )
    with right:
        chart(
            charts.fuel(rows), words="Fuel in cruise at the same thrust. HPC and HPT wear look alike in EGT and fuel."
        )
    with st.expander("The coefficients as a table"):
        show([_percent(row) for row in rows], name="coefficients", digits=2)
    chart(
        charts.ambient(
            found.tables["ambient"],
            removal_margin_degC=kind.removal_margin_degC,
            corner_point_degC=kind.corner_point_degC,
        ),
        words="Above the corner point an engine gives less than its rating; the line is what full thrust would leave.",
    )
    show(found.tables["ratings"], name="ratings")


def _worth(found: FleetAnswer) -> None:
    """Show which module's restoration buys most degrees, and most fuel, for its price."""
    st.subheader("What a restoration brings")
    rows = found.tables["restorations"]
    if not rows:
        st.info("No module of this type flies, or no work of it restores margin.")
        return
    for sentence in found.sentences:
        st.text(sentence)
    chart(charts.worth(rows), words="The mean over the modules that fly, at the fleet's fuel price; not discounted.")
    show(rows, name="restorations")


def _spare(fleet: Fleet, name: str) -> None:
    """Ask for a spare module and an engine, and show what the one would do on the other."""
    st.subheader("A spare module on an engine")
    shelf = [str(row["module_serial"]) for row in spare_modules(fleet) if row["engine_type"] == name]
    engines = [row.engine_serial for row in fleet.engines if row.engine_type == name and row.tail]
    if not shelf or not engines:
        st.info("There is no spare module, or no engine on an aircraft.")
        return
    kinds = {row.module_serial: row.module for row in fleet.modules}
    left, right = st.columns(2)
    module = left.selectbox("Spare module", shelf, format_func=lambda serial: f"{serial} ({kinds[serial]})")
    engine = right.selectbox("Engine", engines)
    try:
        _exchange(spare_on_engine(fleet, engine_serial=engine, module_serial=module))
        refused = Fitting(fleet).refusals(module, engine)
    except UserError as error:
        st.text(str(error))
        return
    if refused:
        st.warning("It may not go on that engine:")
        for one in refused:
            st.text(f"{one.test}: {one.reason}")


def _exchange(row: Exchange) -> None:
    first, second, third, fourth = st.columns(4)
    first.metric("Margin now, degC", f"{row.margin_before_degC:.1f}")
    second.metric("With the spare, degC", f"{row.margin_after_degC:.1f}", f"{row.gained_degC:+.1f}")
    third.metric("Fuel saved, kg a year", f"{row.fuel_kg_per_year:,.0f}")
    fourth.metric("Worth, USD a year", f"{row.fuel_usd_per_year:,.0f}")
    st.text(f"{row.module_off} comes off {row.engine_serial} on {row.tail}, {row.module_on} goes on.")


def _trends(fleet: Fleet, name: str) -> None:
    """Show what the readings say of one engine: fit, steps, forecast; the engines soonest at their margin first."""
    st.subheader("Margin over time")
    try:
        tables, warnings = _fitted(data.inputs(), str(data.fleet_path()))
    except UserError as error:
        st.text(str(error))
        return
    rows = [row for row in tables["margins"] if row["engine_type"] == name]
    if not rows:
        st.info("No engine of this type has readings.")
        return
    serial = st.selectbox("Engine with readings", [row["engine_serial"] for row in rows], key="trend-engine")
    kind = next(row for row in fleet.engine_types if row.engine_type == name)
    steps = [row for row in tables["steps"] if row["engine_serial"] == serial]
    chart(
        fit_charts.trend(
            [row for row in tables["ahead"] if row["engine_serial"] == serial],
            steps=steps,
            removal_margin_degC=kind.removal_margin_degC,
        ),
        words="Readings, robust fit and forecast with its 95 % band. A statistic: it defers no inspection.",
    )
    if steps:
        show(steps, name="steps")
    with st.expander("Fitted margins of every engine"):
        show(rows, name="fitted-margins", digits=2)
    with st.expander("Rates of the type"):
        show([row for row in tables["margin_types"] if row["engine_type"] == name], name="fitted-rates", digits=2)
        for sentence in warnings:
            st.text(sentence)


st.title("Engine")
st.write("What a point lost in each module costs in margin and fuel, how sure that is, and what brings it back.")

chosen_fleet = data.fleet()
types = [row.engine_type for row in chosen_fleet.engine_types]
chosen = st.segmented_control("Engine type", types, default=types[0], key="engine-type") or types[0]
try:
    answer = _answer(data.inputs(), str(data.fleet_path()), chosen)
except UserError as fault:
    st.error("The gas path cannot be computed:")
    st.text(str(fault))
    st.stop()
_physics(answer, chosen_fleet, chosen)
_worth(answer)
_spare(chosen_fleet, chosen)
_trends(chosen_fleet, chosen)
with st.expander("Stations of the gas path"):
    show(answer.tables["stations"], name="stations")
with st.expander("What was assumed"):
    for warning in answer.warnings:
        st.text(warning)
