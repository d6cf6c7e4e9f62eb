"""Hazards: the age at which a budget is spent inverts the cumulative hazard, given the age reached."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from sim.hazard import age_when, cumulative, quantile_ahead, scale_in, survival

shapes = st.floats(0.5, 6.0)
scales = st.floats(10.0, 1e5)


@given(st.floats(0.0, 5e4), shapes, scales, st.floats(1e-3, 20.0))
def test_the_budget_is_spent_at_the_age_found(age: float, shape: float, scale: float, budget: float) -> None:
    used_up = cumulative(age, shape, scale)
    found = age_when(budget, age, shape, scale)
    assert found >= age
    assert cumulative(found, shape, scale) - used_up == pytest.approx(budget, rel=1e-6, abs=1e-9 * (1 + used_up))


@given(st.floats(0.0, 2e4), shapes, scales, st.floats(0.01, 0.99))
def test_a_quantile_ahead_has_its_chance(age: float, shape: float, scale: float, chance: float) -> None:
    if cumulative(age, shape, scale) > 1e4:
        return  # an age that nothing reaches
    ahead = quantile_ahead(chance, age, shape, scale)
    assert 1.0 - survival(age, ahead, shape, scale) == pytest.approx(chance, rel=1e-5, abs=1e-9)


def test_the_exponential_has_no_memory() -> None:
    assert age_when(0.7, 1234.0, 1.0, 100.0) - 1234.0 == pytest.approx(70.0)


def test_a_harder_environment_shortens_life() -> None:
    assert scale_in(1.45, 1000.0, 1.0) == pytest.approx(1000.0 / 1.45)
    assert scale_in(1.45, 1000.0, 0.0) == 1000.0


def test_the_median_of_a_weibull() -> None:
    assert quantile_ahead(0.5, 0.0, 3.0, 14_200.0) == pytest.approx(14_200.0 * math.log(2) ** (1 / 3))
