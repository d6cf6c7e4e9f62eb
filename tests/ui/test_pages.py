"""Every page on the demo fleet, through the app tester."""

from __future__ import annotations

from pathlib import Path

import pytest
from streamlit.testing.v1 import AppTest

ROOT = Path(__file__).resolve().parents[2]


@pytest.fixture(autouse=True)
def _fleet(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    monkeypatch.setenv("SPOOLWRIGHT_FLEET", str(ROOT / "demo_fleet"))
    monkeypatch.setenv("SPOOLWRIGHT_HOME", str(tmp_path))


def page(name: str) -> AppTest:
    app = AppTest.from_file(str(ROOT / "ui" / "views" / f"{name}.py"), default_timeout=60)
    app.run()
    assert not app.exception, app.exception
    return app


def test_the_fleet_page_shows_the_weakest_first() -> None:
    app = page("fleet")
    frame = app.dataframe[0].value
    wing = frame[frame["place"] == "wing"]
    weakest = wing.head(8)
    assert 120 in set(weakest["cycles_left"])
    assert set(weakest["state"]) == {"weak"}
    assert wing.iloc[-1]["state"] == "in order"
    assert {m.label for m in app.metric} >= {"Engines on the wing", "Weak or at a limit"}


def test_the_strategies_page_offers_every_strategy_and_waits() -> None:
    app = page("strategies")
    assert app.multiselect[0].value == ["whole_engine", "exchange", "cheapest"]
    assert any("press Run" in one.value for one in app.info)


def test_a_study_that_is_gone_is_said_to_be_gone() -> None:
    app = AppTest.from_file(str(ROOT / "ui" / "views" / "strategies.py"), default_timeout=60)
    app.query_params["study"] = "0123456789abcdef"
    app.run()
    assert not app.exception
    assert any("not in the store" in one.value for one in app.warning)


def test_an_empty_store_is_said_to_be_empty() -> None:
    app = page("saved")
    assert any("Nothing is saved yet" in one.value for one in app.info)


def test_the_frame_carries_the_caution_and_the_demo_badge() -> None:
    app = AppTest.from_file(str(ROOT / "ui" / "app.py"), default_timeout=60)
    app.run()
    assert not app.exception
    told = " ".join(one.value for one in app.caption)
    assert "approved limits" in told
    assert "DEMO" in " ".join(str(one.value) for one in app.sidebar.markdown) or "DEMO" in str(app.sidebar)
