"""A study seen from a page: started outside it, followed once a second, shown when it is done."""

from __future__ import annotations

from typing import Any

import streamlit as st

from planner import runner
from planner.charts import compare as charts
from planner.progress import time_left
from sim.errors import UserError
from ui import data
from ui.widgets.tables import chart, show


def start(request: dict[str, Any]) -> str:
    """Hand a request to the runner; return the name under which it is followed."""
    asked = {"command": "compare", "fleet": str(data.fleet_path().resolve()), **request}
    return runner.submit(asked, user="screen")


def known(job: str) -> bool:
    """Return whether the runner knows a study of that name."""
    try:
        runner.status(job)
    except (UserError, OSError, ValueError):
        return False
    return True


def follow(job: str) -> None:
    """Show progress with a way to cancel, until the study is over."""
    if runner.status(job).is_over:
        over = runner.status(job)
        if over.state == "failed":
            st.error("The study could not be done:")
            st.text(over.error or "")
        return
    _ticking(job)


@st.fragment(run_every=1.0)
def _ticking(job: str) -> None:
    status = runner.status(job)
    if status.is_over:
        st.rerun()
    share = status.done / status.total if status.total else 0.0
    left = time_left(status.seconds_left) if status.seconds_left is not None else "waiting to start"
    st.progress(min(1.0, share), text=f"{status.done} of {status.total or '?'} simulations, {left}")
    for pair in (status.note or {}).get("pairs", []):
        half = (pair["high"] - pair["low"]) / 2e6
        st.text(f"so far: {pair['a']} less {pair['b']} {pair['mean'] / 1e6:+.2f} ± {half:.2f} M USD")
    if st.button("Cancel and keep what is done", key=f"cancel-{job}"):
        runner.cancel(job)


def answer_of(job: str) -> dict[str, Any] | None:
    """Return the answer once the study is over."""
    return runner.answer(job) if runner.status(job).is_over else None


def results(answer: dict[str, Any]) -> None:
    """Show an answer: sentences, figures, charts and tables, with what was assumed."""
    result = answer["result"]
    for sentence in result["sentences"]:
        st.info(sentence.replace("$", "\\$").replace("_", "\\_"))
    if not result["strategies"]:
        return
    for column, row in zip(st.columns(len(result["strategies"])), result["strategies"], strict=True):
        with column.container(border=True):
            st.text(row["strategy"])
            st.metric("Total, M USD", f"{row['total_usd_mean'] / 1e6:,.1f}")
            st.metric("Aircraft-days lost", f"{row['aircraft_days_lost_mean']:,.0f}")
            st.metric("Removals", f"{row['removals_mean']:,.0f}")
    money, downtime, spread, tables = st.tabs(["Money", "Downtime and removals", "Difference", "Tables"])
    with money:
        chart(charts.costs_by_line(result["costs"]), words="Mean over runs; the value of life counts what was used up.")
        chart(
            charts.cumulative_cash(result["cash_by_year"]), words="Cash alone, present value, added up over the years."
        )
    with downtime:
        chart(charts.downtime_by_reason(result["downtime"]), words="Mean aircraft-days lost over the horizon.")
        chart(charts.removals_by_cause(result["removals"]), words="Mean removals over the horizon, all types.")
    with spread:
        for row in result["differences"]:
            words = f"Paired runs; 95 % interval of the mean {row['total_usd_low'] / 1e6:+.2f} to "
            words += (
                f"{row['total_usd_high'] / 1e6:+.2f} M USD; {row['a']} cheaper in {row['cheaper_chance']:.0%} of runs."
            )
            chart(
                charts.difference_spread(result["difference_samples"], row["a"], row["b"]),
                words=words.replace("_", "\\_"),
            )
    with tables:
        _tables(result)
    for warning in answer["warnings"]:
        st.text(f"Assumed: {warning}")
    saved = f", saved as {answer['study']}" if answer.get("study") else ""
    st.text(f"Version {answer['version']}, seed {answer['seed']}, inputs {answer['inputs'][:12]}{saved}")


def _tables(result: dict[str, Any]) -> None:
    usd = ("total_usd_mean", "total_usd_p10", "total_usd_p50", "total_usd_p90", "cash_usd_mean")
    st.subheader("Strategies")
    show(result["strategies"], name="strategies", money=usd)
    st.subheader("Differences")
    show(result["differences"], name="differences", money=("total_usd_mean", "total_usd_low", "total_usd_high"))
    st.subheader("Cost by year and line")
    show(result["costs"], name="costs", money=("usd_mean",))
    st.subheader("Cheapest by horizon and basis")
    show(result["sweep"], name="sweep", money=("usd_mean",))
