"""Charts of the question engine: pure functions from rows to charts that the browser can draw."""

from __future__ import annotations

from typing import Any

import pytest

from planner.charts import engine as charts

ROW: dict[str, Any] = {
    "engine_type": "N",
    "module": "HPT",
    "component": "hpt",
    "change": "efficiency",
    "egt_K": 12.0,
    "egt_K_low": 9.0,
    "egt_K_high": 15.0,
    "fuel_cruise_frac": 0.006,
    "fuel_cruise_frac_low": 0.005,
    "fuel_cruise_frac_high": 0.007,
}


@pytest.mark.parametrize(("draw", "value"), [(charts.heat, 12.0), (charts.fuel, 0.6)])
def test_a_coefficient_is_drawn_with_its_band(draw: Any, value: float) -> None:
    drawn = draw([ROW, {**ROW, "change": "throat_area"}]).to_dict()
    (rows,) = drawn["datasets"].values()
    assert rows[0]["place"] == "HPT: hpt"
    assert rows[0]["value"] == pytest.approx(value)
    assert rows[0]["low"] < rows[0]["value"] < rows[0]["high"]
    assert len(drawn["layer"]) == 2


def test_margin_against_ambient_has_redline_threshold_and_corner_point() -> None:
    rows = [
        {"engine_type": "N", "rating": rating, "ambient_degC": at, "margin_degC": 100.0 - 4.0 * at}
        for rating in ("high", "low")
        for at in (0.0, 30.0)
    ]
    drawn = charts.ambient(rows, removal_margin_degC=5.0, corner_point_degC=30.0).to_dict()
    assert len(drawn["layer"]) == 3
    values = [row for table in drawn["datasets"].values() for row in table]
    assert {row["margin"] for row in values if "margin" in row} == {0.0, 5.0}


def test_worth_is_a_million_worth_of_each_module() -> None:
    row = {"module": "HPT", "level": "restoration", "regained_degC": 15.0, "cost_usd": 1.5e6, "fuel_usd_per_year": 3e4}
    drawn = charts.worth([row, {**row, "module": "gearbox", "regained_degC": 0.0}]).to_dict()
    (rows,) = drawn["datasets"].values()
    assert [(one["module"], one["degrees"], one["fuel"]) for one in rows] == [("HPT", 10.0, 20.0)]
