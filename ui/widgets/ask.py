"""The form of the Strategies page: strategies, what-ifs, how many runs."""

from __future__ import annotations

from typing import Any

import streamlit as st

from planner.scenario import WhatIf, stock_held
from planner.study import CompareRequest, to_settings
from sim.errors import RequestError
from sim.fleet import Fleet, Holding


def form(fleet: Fleet) -> dict[str, Any] | None:
    """Return the request as plain values when Run is pressed, else None."""
    names = [s.strategy for s in fleet.strategies]
    with st.form("ask", border=True):
        left, right = st.columns(2)
        chosen = left.multiselect("Strategies", names, default=names)
        years = right.slider("Horizon, years", 1, 20, int(fleet.settings.horizon_years))
        goal = left.number_input(
            "Build goal, cycles (0: as in the records)", min_value=0, max_value=40_000, value=0, step=500
        )
        factor = right.slider("Turn times, against the records", 0.5, 2.0, 1.0, 0.05)
        fuel = left.number_input(
            "Fuel, USD/kg", min_value=0.0, max_value=5.0, value=float(fleet.settings.fuel_price_usd_per_kg), step=0.05
        )
        runs = right.number_input(
            "Runs (0: until the interval is narrow)", min_value=0, max_value=2_000, value=40, step=8
        )
        precision = left.select_slider(
            "Half-width asked, share of total cost (when runs is 0)", [0.001, 0.002, 0.005, 0.01, 0.02], value=0.01
        )
        seed = right.number_input("Seed of the luck", min_value=0, max_value=1_000_000, value=1)
        stock = _stock(fleet)
        same = st.checkbox("The same money in spares for each strategy (fair comparison)")
        pressed = st.form_submit_button("Run", type="primary")
    if not pressed:
        return None
    if not chosen:
        st.error("Choose at least one strategy.")
        return None
    try:
        request = CompareRequest(
            strategies=tuple(chosen),
            runs=int(runs) or None,
            precision_frac=float(precision),
            seed=int(seed),
            same_money=same,
            what_if=WhatIf(
                stock=stock,
                build_goal_cycles=int(goal) or None,
                turn_time_factor=float(factor),
                fuel_price_usd_per_kg=float(fuel),
                horizon_years=float(years),
            ),
        )
    except RequestError as error:
        st.error("This cannot be asked:")
        st.text(str(error))
        return None
    return to_settings(request)


def _stock(fleet: Fleet) -> tuple[Holding, ...]:
    """Ask for spare engines and modules; only what differs from what is held becomes a what-if."""
    held = stock_held(fleet)
    rows = []
    with st.expander("Spare engines and modules"):
        for kind in fleet.engine_types:
            name = kind.engine_type
            items = ["engine", *(m.module for m in fleet.module_types if m.engine_type == name)]
            columns = st.columns(len(items))
            for column, item in zip(columns, items, strict=True):
                now = held.get((name, item), 0)
                wanted = column.number_input(f"{name} {item}", 0, 60, now, key=f"stock-{name}-{item}")
                if wanted != now:
                    rows.append(Holding(engine_type=name, module=item, count=int(wanted)))
    return tuple(rows)
