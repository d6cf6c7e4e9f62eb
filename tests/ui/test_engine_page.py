"""The Engine page on the demo fleet, through the app tester."""

from __future__ import annotations

from pathlib import Path

import pytest
import small_tables
from streamlit.testing.v1 import AppTest

ROOT = Path(__file__).resolve().parents[2]


def page(monkeypatch: pytest.MonkeyPatch, fleet: Path) -> AppTest:
    monkeypatch.setenv("SPOOLWRIGHT_FLEET", str(fleet))
    app = AppTest.from_file(str(ROOT / "ui" / "views" / "engine.py"), default_timeout=60)
    app.run()
    assert not app.exception, app.exception
    return app


def test_the_page_answers_the_three_questions(monkeypatch: pytest.MonkeyPatch) -> None:
    app = page(monkeypatch, ROOT / "demo_fleet")
    told = " ".join(one.value for one in app.text)
    assert "most degrees for its price" in told
    assert "most fuel for its price" in told
    assert {one.label for one in app.metric} >= {"With the spare, degC", "Worth, USD a year"}
    assert "never inferred" in told
    columns = set(app.dataframe[0].value.columns)
    assert {"module", "component", "egt_K", "egt_K_low", "fuel_cruise_percent"} <= columns


def test_the_trend_of_an_engine_can_be_chosen(monkeypatch: pytest.MonkeyPatch) -> None:
    app = page(monkeypatch, ROOT / "demo_fleet")
    box = next(one for one in app.selectbox if one.label == "Engine with readings")
    fitted = next(one.value for one in app.dataframe if "date_p50" in one.value.columns)
    assert box.value == fitted["engine_serial"].iloc[0]
    box.set_value(box.options[3]).run()
    assert not app.exception


def test_another_spare_changes_the_answer(monkeypatch: pytest.MonkeyPatch) -> None:
    app = page(monkeypatch, ROOT / "demo_fleet")
    seen = set()
    for serial in app.selectbox[0].options[:3]:
        app.selectbox[0].set_value(serial.split(" ")[0]).run()
        assert not app.exception
        seen.add(app.metric[1].value)
    assert len(seen) > 1


def test_the_other_type_has_its_own_figures(monkeypatch: pytest.MonkeyPatch) -> None:
    app = page(monkeypatch, ROOT / "demo_fleet")
    before = app.dataframe[0].value["egt_K"].tolist()
    app.segmented_control[0].set_value("W").run()
    assert not app.exception
    assert app.dataframe[0].value["egt_K"].tolist() != before


def test_a_type_that_cannot_be_computed_says_what_to_fill(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    app = page(monkeypatch, small_tables.write(tmp_path / "fleet", small_tables.small_tables()))
    assert "cannot be computed" in app.error[0].value
    assert "bypass_ratio: found a blank cell" in app.text[0].value
