"""Charts of a comparison are drawn from rows alone, and the palette can be read."""

from __future__ import annotations

import pytest

from planner.charts import compare
from planner.charts.fleet import engines_left
from planner.charts.palette import GOOD, NEUTRAL, SERIES, STOP, WARN, contrast

COSTS = [
    {"strategy": s, "engine_type": "N", "year": 2026, "line": line, "usd_mean": usd}
    for s in ("a", "b")
    for line, usd in (("work", 3e6), ("parts", 2e6), ("life_end", -1e6))
]


def test_costs_are_grouped_and_carry_units() -> None:
    drawn = compare.costs_by_line(COSTS).to_dict()
    assert drawn["encoding"]["x"]["title"] == "present cost, M USD"
    rows = next(iter(drawn["datasets"].values()))
    assert sum(row["million"] for row in rows) == pytest.approx(8.0)


def test_cash_adds_up_over_the_years() -> None:
    cash = [{"strategy": "a", "year": year, "usd_mean": 1e6} for year in (2026, 2027, 2028)]
    drawn = compare.cumulative_cash(cash).to_dict()
    rows = next(iter(drawn["datasets"].values()))
    assert [row["million"] for row in rows] == pytest.approx([1.0, 2.0, 3.0])


def test_the_difference_shows_zero_and_the_mean() -> None:
    samples = [{"a": "a", "b": "b", "run": n, "total_usd": 1e6 * n} for n in range(5)]
    drawn = compare.difference_spread(samples, "a", "b").to_dict()
    marks = [row for rows in drawn["datasets"].values() for row in rows if "mark" in row]
    assert {row["mark"]: row["at"] for row in marks} == {"zero": 0.0, "mean": 2.0}


def test_grouped_bars_name_every_reason() -> None:
    rows = [{"strategy": "a", "reason": r, "aircraft_days_mean": 1.0} for r in ("no engine", "engine change")]
    assert compare.downtime_by_reason(rows).to_dict()["encoding"]["y"]["sort"] == ["no engine", "engine change"]


def test_state_is_told_by_shape_as_well_as_colour() -> None:
    row = {"engine_serial": "E", "tail": "A", "cycles_left": 5, "limited_by": "P", "margin_degC": 3.0, "state": "weak"}
    drawn = engines_left([row]).to_dict()["encoding"]
    assert drawn["shape"]["field"] == drawn["color"]["field"] == "state"


@pytest.mark.parametrize("colour", [*SERIES, GOOD, WARN, STOP, NEUTRAL])
@pytest.mark.parametrize("page", ["#ffffff", "#12181f"])
def test_every_colour_stands_out_on_both_pages(colour: str, page: str) -> None:
    # WCAG 2.1, 1.4.11: graphical objects want 3:1
    assert contrast(colour, page) >= 3.0
