"""Hazards in closed form: budgets, ages conditional on survival, and changes of scale in mid-life."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from sim.hazard import age_when, cumulative, quantile_ahead, scale_in, survival

ages = st.floats(0.0, 40_000.0)
shapes = st.floats(0.4, 6.0)
scales = st.floats(500.0, 60_000.0)
chances = st.floats(0.001, 0.999)


def test_the_scale_is_the_age_by_which_a_budget_of_one_is_spent() -> None:
    assert cumulative(9_000.0, 3.0, 9_000.0) == pytest.approx(1.0)
    assert age_when(1.0, 0.0, 3.0, 9_000.0) == pytest.approx(9_000.0)


def test_a_worked_case_conditional_on_age() -> None:
    # shape 2, scale 100, age 60: (60/100)^2 = 0.36 is used; a budget of 0.64 more is spent at 100
    assert age_when(0.64, 60.0, 2.0, 100.0) == pytest.approx(100.0)
    assert survival(60.0, 40.0, 2.0, 100.0) == pytest.approx(math.exp(-0.64))


def test_the_exponential_forgets_its_age() -> None:
    assert survival(0.0, 700.0, 1.0, 2_000.0) == pytest.approx(survival(9_999.0, 700.0, 1.0, 2_000.0))
    assert age_when(0.5, 9_999.0, 1.0, 2_000.0) == pytest.approx(9_999.0 + 1_000.0)


@given(age=ages, shape=shapes, scale=scales, chance=chances)
def test_a_quantile_is_the_inverse_of_survival(age: float, shape: float, scale: float, chance: float) -> None:
    ahead = quantile_ahead(chance, age, shape, scale)
    # an age carries about 1e-16 of itself: near steep hazards that much age is this much of the chance
    slope = shape * (max(age, ahead) / scale) ** shape
    assert 1.0 - survival(age, ahead, shape, scale) == pytest.approx(chance, rel=1e-6, abs=1e-9 + 1e-13 * slope)


@given(age=ages, shape=shapes, scale=scales, budget=st.floats(0.0, 20.0), more=st.floats(0.0, 20.0))
def test_a_larger_budget_never_strikes_earlier(
    age: float, shape: float, scale: float, budget: float, more: float
) -> None:
    first = age_when(budget, age, shape, scale)
    assert age <= first <= age_when(budget + more, age, shape, scale) * (1.0 + 1e-12)


@given(shape=shapes, scale=scales, budget=st.floats(0.01, 10.0), share=st.floats(0.01, 0.99))
def test_a_budget_may_be_spent_in_two_steps(shape: float, scale: float, budget: float, share: float) -> None:
    whole = age_when(budget, 0.0, shape, scale)
    half_way = age_when(share * budget, 0.0, shape, scale)
    left = budget - cumulative(half_way, shape, scale)
    assert age_when(left, half_way, shape, scale) == pytest.approx(whole, rel=1e-9)


@given(shape=st.floats(1.01, 6.0), scale=scales, age=ages, older=st.floats(1.0, 10_000.0))
def test_with_wear_out_an_older_module_survives_less(shape: float, scale: float, age: float, older: float) -> None:
    assert survival(age + older, 500.0, shape, scale) <= survival(age, 500.0, shape, scale) + 1e-12


def test_a_harsh_environment_divides_the_scale() -> None:
    assert scale_in(1.45, 11_400.0, 1.0) == pytest.approx(11_400.0 / 1.45)
    assert scale_in(1.45, 11_400.0, 0.0) == 11_400.0
    assert scale_in(1.0, 11_400.0, 2.0) == 11_400.0
