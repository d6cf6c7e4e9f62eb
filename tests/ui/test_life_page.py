"""The page Life left on the demo fleet and on a fleet with an unknown life, through the app tester."""

from __future__ import annotations

from pathlib import Path

import pytest
import small_tables
from streamlit.testing.v1 import AppTest

from planner import life

ROOT = Path(__file__).resolve().parents[2]


def page(monkeypatch: pytest.MonkeyPatch, fleet: Path) -> AppTest:
    monkeypatch.setenv("SPOOLWRIGHT_FLEET", str(fleet))
    app = AppTest.from_file(str(ROOT / "ui" / "views" / "life.py"), default_timeout=60)
    app.run()
    assert not app.exception, app.exception
    return app


def test_the_demo_shows_limits_directives_owners_and_records(monkeypatch: pytest.MonkeyPatch) -> None:
    app = page(monkeypatch, ROOT / "demo_fleet")
    engines, parts, directives, places, problems = (frame.value for frame in app.dataframe)
    expected = life.answer(ROOT / "demo_fleet")
    assert parts["part_serial"].tolist() == [row.part_serial for row in expected.parts]
    assert parts["cycles_left"].is_monotonic_increasing
    assert engines["engine_serial"].iloc[0] == expected.engines[0].engine_serial
    assert directives["over_on_day_one"].sum() == sum(row.over_on_day_one for row in expected.directives)
    assert len(places) == len(expected.places) > 0
    assert set(problems["severity"]) == {"warns"}
    assert any("as planned" in one.value for one in app.text)


def test_one_aircraft_and_a_later_day(monkeypatch: pytest.MonkeyPatch) -> None:
    app = page(monkeypatch, ROOT / "demo_fleet")
    app.selectbox[0].set_value("NA-01").run()
    assert not app.exception
    assert set(app.dataframe[1].value["tail"]) == {"NA-01"}
    left = app.dataframe[1].value["cycles_left"].max()
    day = app.date_input[0].value
    app.date_input[0].set_value(day.replace(year=day.year + 1)).run()
    assert not app.exception
    assert app.dataframe[1].value["cycles_left"].max() < left


def test_states_are_told_in_words(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    tables = small_tables.small_tables()
    tables["parts"][0]["status_substantiated"] = "no"
    app = page(monkeypatch, small_tables.write(tmp_path / "fleet", tables))
    assert {m.label: m.value for m in app.metric}["Parts unknown"] == "1"
    app.multiselect[0].set_value(["unknown"]).run()
    assert app.dataframe[1].value["part_serial"].tolist() == ["F101"]
    assert any("No directive" in one.value for one in app.info)


def test_records_that_stop_are_told_instead(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    tables = small_tables.small_tables()
    tables["parts"][0]["cycles_since_new"] = "-1"
    app = page(monkeypatch, small_tables.write(tmp_path / "fleet", tables))
    assert any("cannot be used" in one.value for one in app.error)
    assert any("parts.csv row 2" in one.value for one in app.text)
