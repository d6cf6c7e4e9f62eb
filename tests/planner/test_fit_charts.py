"""Charts of fitted records: every reading, the fit, what is carried forward, steps and the removal margin are drawn."""

from __future__ import annotations

import datetime as dt
import json
from typing import Any

from planner.charts import fit as charts

Row = dict[str, Any]


def ahead() -> list[Row]:
    """Return twelve readings, the fifth of them an outlier, and six months to come."""
    rows = []
    for number in range(18):
        read = number < 12
        margin = 40.0 - number
        rows.append(
            {
                "engine_serial": "E1",
                "date": dt.date(2025, 1, 1) + dt.timedelta(days=30 * number),
                "cycles_since_install": 150 * number,
                "reading_degC": margin + (20.0 if number == 4 else 0.3) if read else None,
                "margin_degC": margin,
                "low": margin - 1.0,
                "high": margin + 1.0,
                "weight": (0.0 if number == 4 else 0.98) if read else None,
                "hottest_ambient_degC": 35.0,
                "hot_day_degC": 31.0,
            }
        )
    return rows


STEP = {
    "engine_serial": "E1",
    "from_date": dt.date(2025, 5, 1),
    "to_date": dt.date(2025, 5, 31),
    "size_degC": -9.0,
    "low": -12.0,
    "high": -6.0,
    "explained": "not in the records: damage or reading?",
}


def drawn(*, steps: list[Row]) -> dict[str, Any]:
    chart = charts.trend(ahead(), steps=steps, removal_margin_degC=5.0).to_dict()
    return json.loads(json.dumps(chart))  # type: ignore[no-any-return]


def rows_with(chart: dict[str, Any], column: str) -> list[Row]:
    return [row for rows in chart["datasets"].values() for row in rows if column in row]


def test_readings_outliers_fit_and_what_comes_are_told_apart() -> None:
    chart = drawn(steps=[])
    kinds = [row["kind"] for row in rows_with(chart, "kind")]
    assert kinds.count("reading") == 11
    assert kinds.count("outlier") == 1
    parts = [row["part"] for row in rows_with(chart, "part") if "kind" not in row]
    assert parts.count("fitted to readings") == 12
    # the six months to come and the last fitted point, so that the line has no gap
    assert parts.count("carried forward") == 7


def test_nothing_is_told_by_colour_alone() -> None:
    encodings = [layer["encoding"] for layer in drawn(steps=[])["layer"]]
    lines = next(one for one in encodings if "strokeDash" in one)
    assert lines["strokeDash"]["field"] == lines["color"]["field"] == "part"
    assert any("shape" in one for one in encodings)


def test_steps_are_ruled_and_labelled() -> None:
    labels = {row["label"] for row in rows_with(drawn(steps=[STEP]), "label")}
    assert labels == {"step -9 degC", "removal margin 5 degC"}
    assert {row["label"] for row in rows_with(drawn(steps=[]), "label")} == {"removal margin 5 degC"}


def test_axes_name_what_they_show() -> None:
    layer = drawn(steps=[])["layer"][0]
    assert layer["encoding"]["y"]["title"] == "hot-day EGT margin, degC"
    assert layer["encoding"]["x"]["axis"]["format"] == "%b %Y"


def hazard(cause: str, *, scale: float | None, clock: str = "cycles") -> Row:
    names = {"engine_type": "N", "module": "HPT", "run": "mature"}
    return names | {"cause": cause, "shape": 3.0, "scale": scale, "clock": clock}


def test_a_cause_has_failed_with_63_percent_at_its_scale() -> None:
    rows = [hazard("distress", scale=9_000.0), hazard("unscheduled", scale=None), hazard("x", scale=1.0, clock="hours")]
    chart = charts.failing(rows).to_dict()
    points = rows_with(chart, "chance")
    assert {point["cause"] for point in points} == {"N HPT, distress (mature)"}
    near = min(points, key=lambda point: abs(point["age"] - 9_000.0))
    assert abs(near["chance"] - 63.2) < 3.0
    chances = [point["chance"] for point in points]
    assert chances == sorted(chances)


def test_no_hazards_make_an_empty_chart() -> None:
    assert rows_with(charts.failing([]).to_dict(), "chance") == []
