"""Goodness of fit, early chance, best age to replace, and trends of a repaired fleet."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.optimize import minimize_scalar
from scipy.special import gammainc

from planner.fit_hazard import Lives, held_shape, lives, weibull
from planner.fit_hazard_check import goodness
from planner.fit_hazard_early import early_chance
from planner.fit_hazard_replace import best_age
from planner.fit_hazard_trend import MOST_EXACT, large_sample_limits, power_law
from sim.errors import NoSolutionError, RequestError


def followed(rng: np.random.Generator, *, shape: float, count: int) -> Lives:
    entry = np.where(rng.random(count) < 0.3, rng.uniform(0.0, 600.0, count), 0.0)
    fails = 1000.0 * ((entry / 1000.0) ** shape + rng.exponential(size=count)) ** (1.0 / shape)
    leaves = entry + rng.uniform(200.0, 1_500.0, count)
    return lives(np.minimum(fails, leaves), fails <= leaves, entries=entry)


@pytest.mark.parametrize("shape", [1.0, 2.5])
def test_a_law_that_holds_is_refused_as_seldom_as_promised(shape: float) -> None:
    rng = np.random.default_rng(11)
    chances = []
    for _ in range(250):
        data = followed(rng, shape=shape, count=60)
        fit = held_shape(data, shape=1.0) if shape == 1.0 else weibull(data)
        found = goodness(data, fit)
        assert found is not None
        assert found.seen.sum() == data.failures
        assert found.expected.sum() == pytest.approx(data.failures, rel=1e-6)
        chances.append(found.chance)
    # binomial with p 0.05 and 0.5 of 250: 12.5 +- 3.4 and 125 +- 7.9, three standard deviations each
    assert 2 <= sum(chance < 0.05 for chance in chances) <= 23
    assert 101 <= sum(chance < 0.5 for chance in chances) <= 149


def test_two_mixed_laws_are_found_out() -> None:
    rng = np.random.default_rng(12)
    ages = np.concatenate([100.0 * rng.weibull(4.0, 60), 2_000.0 * rng.weibull(6.0, 60)])
    data = lives(ages, [True] * 120)
    found = goodness(data, weibull(data))
    assert found is not None
    assert found.chance < 1e-4


def test_with_few_failures_there_is_no_test() -> None:
    data = followed(np.random.default_rng(13), shape=2.0, count=14)
    assert goodness(data, weibull(data)) is None


def test_early_chance_of_complete_records_is_a_share() -> None:
    builds = lives([50.0] * 3 + [400.0] * 97, [True] * 3 + [False] * 97)
    found = early_chance(builds, within=150.0)
    assert found.chance == pytest.approx(0.03)
    assert (found.failures, found.followed) == (3, 100)
    assert 0.005 < found.low < 0.03 < found.high < 0.1


def test_a_build_still_young_is_no_proof_of_survival() -> None:
    # 10 builds; 4 are followed for 60 cycles only; one of the 6 others fails at 100: 1/6, not 1/10
    builds = lives([60.0] * 4 + [100.0] + [300.0] * 5, [False] * 4 + [True] + [False] * 5)
    assert early_chance(builds, within=150.0).chance == pytest.approx(1.0 / 6.0)


def test_a_later_failure_is_no_early_one() -> None:
    builds = lives([100.0, 151.0, 300.0, 300.0], [True, True, False, False])
    assert early_chance(builds, within=150.0).failures == 1


def test_without_an_early_failure_there_is_an_upper_limit() -> None:
    found = early_chance(lives([400.0] * 59, [False] * 59), within=150.0)
    assert found.chance == 0.0
    assert found.high == pytest.approx(0.05, abs=0.001)


def test_builds_that_nobody_followed_are_refused() -> None:
    with pytest.raises(NoSolutionError, match="150 cycles"):
        early_chance(lives([60.0], [False]), within=150.0)


@settings(max_examples=60, deadline=None)
@given(shape=st.floats(1.3, 6.0), scale=st.floats(10.0, 1e5), ratio=st.floats(1.5, 50.0))
def test_no_other_age_costs_less(shape: float, scale: float, ratio: float) -> None:
    best = best_age(shape=shape, scale=scale, planned_cost=1.0, failed_cost=ratio)

    def cost(age: float) -> float:
        hazard = (age / scale) ** shape
        lived = scale * math.gamma(1.0 + 1.0 / shape) * float(gammainc(1.0 / shape, hazard))
        return (math.exp(-hazard) - ratio * math.expm1(-hazard)) / lived

    found = minimize_scalar(lambda x: cost(scale * math.exp(x)), bounds=(-6.0, 3.0), method="bounded")
    assert best.cost_rate <= float(found.fun) * (1.0 + 1e-6)
    assert best.cost_rate <= best.waiting_cost_rate * (1.0 + 1e-9)
    if best.age is not None:
        assert cost(best.age) == pytest.approx(best.cost_rate, rel=1e-6)


@pytest.mark.parametrize(("shape", "failed_cost"), [(1.0, 10.0), (0.7, 10.0), (3.0, 1.0)])
def test_early_replacement_never_pays_without_wear_out_or_penalty(shape: float, failed_cost: float) -> None:
    best = best_age(shape=shape, scale=100.0, planned_cost=1.0, failed_cost=failed_cost)
    assert best.age is None
    assert best.cost_rate == pytest.approx(failed_cost / (100.0 * math.gamma(1.0 + 1.0 / shape)))


def test_costs_that_cannot_be_are_refused() -> None:
    with pytest.raises(RequestError, match="planned cost"):
        best_age(shape=2.0, scale=100.0, planned_cost=0.0, failed_cost=5.0)


def test_a_steady_fleet_shows_a_trend_as_seldom_as_promised() -> None:
    rng = np.random.default_rng(14)
    chances = [power_law(100.0 * rng.random(20), end=100.0).no_trend_chance for _ in range(400)]
    # 5 % of 400: 20 with a standard deviation of 4.4
    assert 7 <= sum(chance < 0.05 for chance in chances) <= 33


def test_limits_of_shape_and_mean_hold_what_they_promise() -> None:
    rng = np.random.default_rng(15)
    hits = np.zeros(2)
    tries = 0
    for _ in range(300):
        times = 100.0 * rng.random(rng.poisson(12)) ** (1.0 / 1.8)
        if len(times) < 3:
            continue
        trend, tries = power_law(times, end=100.0), tries + 1
        hits += [
            trend.shape_low <= 1.8 <= trend.shape_high,
            trend.mean_between_low <= 100.0 / (1.8 * 12) <= trend.mean_between_high,
        ]
    assert tries > 290
    assert (hits / tries > 0.91).all()


def test_exact_and_large_sample_limits_meet_where_one_takes_over() -> None:
    trend = power_law(np.geomspace(1.0, 900.0, MOST_EXACT), end=1000.0)
    low, high = large_sample_limits(MOST_EXACT, trend.mean_between)
    assert trend.mean_between_low == pytest.approx(low, rel=0.01)
    assert trend.mean_between_high == pytest.approx(high, rel=0.01)
    assert power_law(np.geomspace(1.0, 900.0, MOST_EXACT + 1), end=1000.0).mean_between_low < trend.mean_between


@pytest.mark.parametrize(("times", "error"), [([1.0, 2.0], NoSolutionError), ([1.0, 2.0, 11.0], RequestError)])
def test_too_few_or_impossible_times_are_refused(times: list[float], error: type[Exception]) -> None:
    with pytest.raises(error, match="failure"):
        power_law(times, end=10.0)
