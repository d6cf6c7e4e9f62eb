"""The year's shape: flown years and days are one another's inverse."""

from __future__ import annotations

import datetime as dt

import pytest
from hypothesis import given
from hypothesis import strategies as st

from sim.errors import RequestError
from sim.season import Season

DEMO = (0.90, 0.86, 0.95, 1.00, 1.04, 1.10, 1.16, 1.15, 1.06, 1.00, 0.90, 0.88)


def test_an_even_year_flies_a_day_a_day() -> None:
    season = Season(dt.date(2026, 7, 1), (1.0,) * 12)
    assert season.flown(365.25) == pytest.approx(1.0, abs=1e-12)
    assert season.day(2.0) == pytest.approx(730.5, abs=1e-9)


def test_four_years_of_any_shape_fly_four_years() -> None:
    season = Season(dt.date(2026, 7, 1), DEMO)
    assert season.flown(1461.0) == pytest.approx(4.0, abs=1e-4)


def test_summer_flies_more_than_winter() -> None:
    season = Season(dt.date(2026, 7, 1), DEMO)
    july = season.flown(31.0)
    january = season.flown(215.0) - season.flown(184.0)
    assert july / january == pytest.approx(1.16 / 0.90, rel=1e-9)


@given(st.floats(0.01, 10_000.0), st.dates(dt.date(2020, 1, 1), dt.date(2035, 12, 31)))
def test_days_and_flown_years_invert(day: float, as_of: dt.date) -> None:
    season = Season(as_of, DEMO)
    assert season.day(season.flown(day)) == pytest.approx(day, rel=1e-12, abs=1e-9)


def test_a_month_without_use_is_refused() -> None:
    with pytest.raises(RequestError, match="twelve shares above zero"):
        Season(dt.date(2026, 7, 1), (0.0,) + (1.0,) * 11)
