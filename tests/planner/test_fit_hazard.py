"""Weibull and exponential lives from censored records: hand-worked cases, properties, coverage, refusals."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.fit_hazard import Lives, constant_hazard_chance, held_shape, lives, weibull
from sim.errors import NoSolutionError, RequestError


def followed(seed: int, *, shape: float, scale: float, count: int, late: float = 0.3) -> Lives:
    """Return lives that enter the records at some age (a share of them) and are watched for a while."""
    rng = np.random.default_rng(seed)
    entry = np.where(rng.random(count) < late, rng.uniform(0.0, 0.6 * scale, count), 0.0)
    fails = scale * ((entry / scale) ** shape + rng.exponential(size=count)) ** (1.0 / shape)
    leaves = entry + rng.uniform(0.2 * scale, 1.5 * scale, count)
    return lives(np.minimum(fails, leaves), fails <= leaves, entries=entry)


def test_the_exponential_is_exposure_over_failures() -> None:
    # 2 failures in 400 + 600 + (900 - 100) = 1,800 cycles
    fit = held_shape(lives([400, 600, 900], [True, False, True], entries=[0, 0, 100]), shape=1.0)
    assert fit.scale == pytest.approx(900.0)
    # NIST/SEMATECH e-Handbook 8.4.5.1: limits 2 T / chi-squared with 2 r + 2 and 2 r degrees of freedom
    assert fit.scale_low == pytest.approx(2 * 1800.0 / 14.4494, rel=1e-4)
    assert fit.scale_high == pytest.approx(2 * 1800.0 / 0.484419, rel=1e-4)


def test_the_e_handbooks_limits_for_a_constant_rate() -> None:
    """NIST/SEMATECH e-Handbook 8.4.5.1: 2 failures in 800 h, 90 % limits 127 and 2,251 h."""
    fit = held_shape(lives([400.0, 400.0], [True, True]), shape=1.0, confidence=0.9)
    assert fit.scale_low == pytest.approx(127.07, abs=0.005)
    assert fit.scale_high == pytest.approx(2251.23, abs=0.005)


def test_with_a_held_shape_the_scale_is_a_power_mean() -> None:
    # ages squared 1 + 4 + 9 = 14 over 2 failures
    fit = held_shape(lives([1.0, 2.0, 3.0], [True, True, False]), shape=2.0)
    assert fit.scale == pytest.approx(math.sqrt(7.0))
    assert fit.shape_low is None


def test_without_a_failure_there_is_only_a_lower_limit() -> None:
    fit = held_shape(lives([500.0] * 10, [False] * 10), shape=1.0)
    assert fit.scale is None
    assert fit.scale_high is None
    assert fit.scale_low == pytest.approx(5_000.0 / -math.log(0.05))


def test_a_late_entry_does_not_count_what_came_before() -> None:
    """Leaving the entries out would make a fleet that joins the records old look longer-lived."""
    late = followed(3, shape=3.0, scale=10_000.0, count=3_000, late=1.0)
    fit, blind = weibull(late), weibull(lives(late.low, late.failed))
    assert (fit.shape_low or 0.0) < 3.0 < (fit.shape_high or 0.0)
    assert (fit.scale_low or 0.0) < 10_000.0 < (fit.scale_high or 0.0)
    assert (blind.shape_low or 0.0) > 3.1
    assert (blind.scale_low or 0.0) > 10_100.0


def test_ages_between_looks_lose_little() -> None:
    exact = followed(4, shape=2.5, scale=9_000.0, count=400)
    ends = np.where(exact.failed, np.ceil(exact.low / 500.0) * 500.0, exact.low)
    good = np.where(exact.failed, np.floor(exact.low / 500.0) * 500.0, np.nan)
    seen, known = weibull(lives(ends, exact.failed, entries=exact.entry, last_good=good)), weibull(exact)
    assert seen.shape == pytest.approx(known.shape, rel=0.05)
    assert seen.scale == pytest.approx(known.scale, rel=0.01)


@settings(max_examples=40, deadline=None)
@given(seed=st.integers(0, 10_000), shape=st.floats(0.6, 5.0), count=st.integers(30, 120), unit=st.floats(0.01, 1e4))
def test_intervals_hold_the_estimate_and_units_do_not_matter(seed: int, shape: float, count: int, unit: float) -> None:
    data = followed(seed, shape=shape, scale=1_000.0, count=count)
    if data.failures < 5:
        return
    fit = weibull(data)
    assert fit.shape_low is not None
    assert fit.shape_high is not None
    assert fit.scale is not None
    assert fit.shape_low < fit.shape < fit.shape_high
    assert (fit.scale_low or 0.0) < fit.scale < (fit.scale_high or math.inf)
    other = weibull(Lives(data.entry * unit, data.low * unit, data.high * unit))
    assert other.shape == pytest.approx(fit.shape, rel=1e-5)
    assert other.scale == pytest.approx(fit.scale * unit, rel=1e-5)


@settings(max_examples=30, deadline=None)
@given(seed=st.integers(0, 10_000), shape=st.floats(0.6, 5.0))
def test_no_neighbour_is_likelier(seed: int, shape: float) -> None:
    data = followed(seed, shape=shape, scale=1_000.0, count=60)
    if data.failures < 5:
        return
    fit = weibull(data)
    assert fit.scale is not None

    def log_likelihood(k: float, scale: float) -> float:
        hazard = np.log(k / scale) + (k - 1.0) * np.log(data.low / scale)
        gathered = (data.low / scale) ** k - (data.entry / scale) ** k
        return float(hazard[data.failed].sum() - gathered.sum())

    best = log_likelihood(fit.shape, fit.scale)
    assert fit.log_likelihood == pytest.approx(best, abs=1e-6)
    for factor in (0.98, 1.02):
        assert log_likelihood(fit.shape * factor, fit.scale) < best
        assert log_likelihood(fit.shape, fit.scale * factor) < best


def test_shape_intervals_cover_what_they_promise() -> None:
    hits = {"shape": 0, "scale": 0}
    for seed in range(300):
        fit = weibull(followed(seed, shape=2.5, scale=1_000.0, count=50))
        hits["shape"] += (fit.shape_low or 0.0) <= 2.5 <= (fit.shape_high or math.inf)
        hits["scale"] += (fit.scale_low or 0.0) <= 1_000.0 <= (fit.scale_high or math.inf)
    # 95 % of 300 is 285 with a standard deviation of 3.8; the likelihood ratio is asymptotic: it may cover less
    assert 270 <= hits["shape"] <= 298, hits
    assert 270 <= hits["scale"] <= 298, hits


def test_a_constant_hazard_is_told_from_wear_out() -> None:
    worn, plain = followed(5, shape=3.0, scale=1_000.0, count=100), followed(6, shape=1.0, scale=1_000.0, count=100)
    assert constant_hazard_chance(worn, weibull(worn)) < 1e-6
    assert constant_hazard_chance(plain, weibull(plain)) > 0.05


@pytest.mark.parametrize(
    ("data", "why"),
    [
        (lives([500.0, 700.0], [True, False]), "1 failures"),
        (lives([500.0] * 4, [True] * 4), "one age"),
        (lives([500.0, 400.0, 300.0], [True] * 3, last_good=[0.0] * 3), "first look"),
    ],
)
def test_records_without_a_finite_answer_are_refused(data: Lives, why: str) -> None:
    with pytest.raises(NoSolutionError, match=why):
        weibull(data)


@pytest.mark.parametrize(
    ("ends", "entries", "good", "why"),
    [
        ([-1.0], [0.0], [np.nan], "age at the end"),
        ([np.nan], [0.0], [np.nan], "age at the end"),
        ([5.0], [6.0], [np.nan], "at least the age at entry"),
        ([5.0], [0.0], [6.0], "last seen good"),
    ],
)
def test_ages_out_of_order_are_refused(ends: list[float], entries: list[float], good: list[float], why: str) -> None:
    with pytest.raises(RequestError, match=why):
        lives(ends, [True], entries=entries, last_good=good)


def test_nothing_at_risk_is_refused() -> None:
    with pytest.raises(NoSolutionError, match="at risk"):
        held_shape(lives([5.0], [False], entries=[5.0]), shape=1.0)


def test_a_failure_in_the_cycle_of_its_entry_still_counts() -> None:
    data = lives([0.0, 100.0], [True, True], entries=[0.0, 100.0])
    assert data.failures == 2
    assert list(data.low) == [0.5, 100.5]
