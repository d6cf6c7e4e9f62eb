"""Expected renewals: closed forms, limits and the figures of CHECKS.md by a second method."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from sim.errors import RequestError
from sim.renewal import renewals


def scale_of_mean_one(shape: float) -> float:
    return 1.0 / math.gamma(1.0 + 1.0 / shape)


def by_power_series(t: float, shape: float, terms: int = 90) -> float:
    """Return M(t) by the series of Smith and Leadbetter (*Technometrics* 5, 1963); ``t`` in units of the scale."""
    gamma = [math.exp(math.lgamma(k * shape + 1.0) - math.lgamma(k + 1.0)) for k in range(terms + 1)]
    a = [0.0] * (terms + 1)
    for n in range(1, terms + 1):
        a[n] = gamma[n] - sum(gamma[j] * a[n - j] for j in range(1, n))
    return sum((-1) ** (n - 1) * a[n] * t ** (n * shape) / math.gamma(n * shape + 1.0) for n in range(1, terms + 1))


@pytest.mark.parametrize("shape", [0.7, 1.5, 2.0, 3.0])
def test_the_power_series_agrees(shape: float) -> None:
    scale = scale_of_mean_one(shape)
    ages = np.array([0.25, 0.5, 1.0])
    series = [by_power_series(age / scale, shape, terms=45) for age in ages]
    np.testing.assert_allclose(renewals(ages, shape=shape, scale=scale), series, atol=2e-6)


def test_constant_hazard_renews_in_proportion_to_age() -> None:
    np.testing.assert_allclose(renewals(np.array([0.0, 500.0, 4_000.0]), shape=1.0, scale=2_000.0), [0.0, 0.25, 2.0])


def test_in_the_long_run_a_life_costs_its_mean() -> None:
    # M(t) -> t/mu + (sigma^2/mu^2 - 1)/2 (Barlow and Proschan, ch. 3)
    shape, scale = 2.0, scale_of_mean_one(2.0)
    spread = scale**2 * (math.gamma(2.0) - math.gamma(1.5) ** 2)
    assert renewals(8.0, shape=shape, scale=scale)[0] == pytest.approx(8.0 + (spread - 1.0) / 2.0, abs=1e-5)


@settings(max_examples=30, deadline=None)
@given(shape=st.floats(0.5, 5.0), age=st.floats(0.05, 2.0), more=st.floats(0.01, 1.0))
def test_renewals_rise_with_age_and_lie_between_first_failure_and_hazard(shape: float, age: float, more: float) -> None:
    less, later = renewals(np.array([age, age + more]), shape=shape, scale=1.0)
    assert less <= later + 1e-6
    assert less >= -math.expm1(-(age**shape)) - 1e-6
    if shape >= 1.0:
        assert less <= age**shape + 1e-6


@pytest.mark.parametrize(("shape", "scale", "age"), [(0.0, 1.0, 1.0), (2.0, -1.0, 1.0), (2.0, 1.0, -0.1)])
def test_impossible_questions_are_refused(shape: float, scale: float, age: float) -> None:
    with pytest.raises(RequestError, match="renewals"):
        renewals(age, shape=shape, scale=scale)
