"""The published figures of reliability that fits, hazards and renewals must land on; the source stands beside each."""

from __future__ import annotations

import math

import numpy as np
import pytest
from scipy import stats

from planner.fit_hazard import held_shape, lives, weibull
from planner.fit_hazard_replace import best_age
from planner.fit_hazard_trend import large_sample_limits, power_law
from sim.renewal import renewals

# NIST/SEMATECH e-Handbook 8.4.1.3: 20 units on test, 10 failed, 10 censored at 500 h (read)
NIST_WEIBULL = [55, 187, 216, 240, 244, 335, 361, 373, 375, 386]

# Lieblein and Zelen 1956, millions of revolutions; Lawless, 2003 (as carried by the surpyval package)
BEARINGS = [
    17.88, 28.92, 33.00, 41.52, 42.12, 45.60, 48.40, 51.84, 51.96, 54.12, 55.56, 67.80,
    68.64, 68.64, 68.88, 84.12, 93.12, 98.64, 105.12, 105.84, 127.92, 128.04, 173.40,
]  # fmt: skip

# Proschan, Technometrics 5, 1963: hours between failures of the air conditioning of Boeing 720s, 14 groups as in Scholz
# and Stephens, J. American Statistical Association 82, 1987 (scipy's own tests carry them)
PROSCHAN = [
    [194, 15, 41, 29, 33, 181],
    [413, 14, 58, 37, 100, 65, 9, 169, 447, 184, 36, 201, 118],
    [34, 31, 18, 18, 67, 57, 62, 7, 22, 34],
    [90, 10, 60, 186, 61, 49, 14, 24, 56, 20, 79, 84, 44, 59, 29, 118, 25, 156, 310, 76, 26, 44, 23, 62],
    [130, 208, 70, 101, 208],
    [74, 57, 48, 29, 502, 12, 70, 21, 29, 386, 59, 27],
    [55, 320, 56, 104, 220, 239, 47, 246, 176, 182, 33],
    [23, 261, 87, 7, 120, 14, 62, 47, 225, 71, 246, 21, 42, 20, 5, 12, 120, 11, 3, 14, 71, 11, 14, 11, 16, 90, 1, 16,
     52, 95],
    [97, 51, 11, 4, 141, 18, 142, 68, 77, 80, 1, 16, 106, 206, 82, 54, 31, 216, 46, 111, 39, 63, 18, 191, 18, 163, 24],
    [50, 44, 102, 72, 22, 39, 3, 15, 197, 188, 79, 88, 46, 5, 5, 36, 22, 139, 210, 97, 30, 23, 13, 14],
    [359, 9, 12, 270, 603, 3, 104, 2, 438],
    [50, 254, 5, 283, 35, 12],
    [487, 18, 100, 7, 98, 5, 85, 91, 43, 230, 3, 130],
    [102, 209, 14, 57, 54, 32, 67, 59, 134, 152, 27, 14, 230, 66, 61, 34],
]  # fmt: skip

# MIL-HDBK-189 (1981), app. C: 27 failures in 300 h; the times from memory, and every published figure is landed on
MIL_TIMES = [
    2.6, 16.5, 16.5, 17.0, 21.4, 29.1, 33.3, 56.5, 63.1, 70.6, 73.0, 77.7, 93.9, 95.5, 98.1, 101.1, 132.0, 142.2, 147.7,
    149.0, 167.2, 190.7, 193.0, 198.7, 251.9, 282.5, 286.1,
]  # fmt: skip

# NIST/SEMATECH e-Handbook 8.4.5.2: 10 failures in 1,500 h (read)
NIST_REPAIRS = [5, 40, 43, 175, 389, 712, 747, 795, 1299, 1478]


def test_weibull_of_the_handbook_with_half_the_units_censored() -> None:
    fit = weibull(lives(NIST_WEIBULL + [500] * 10, [True] * 10 + [False] * 10))
    assert fit.shape == pytest.approx(1.72563, abs=5e-6)
    assert fit.scale == pytest.approx(606.005, abs=5e-4)
    assert fit.log_likelihood == pytest.approx(-75.122, abs=5e-4)
    assert (fit.failures, fit.censored) == (10, 10)


def test_weibull_of_the_handbook_with_54_as_the_first_age() -> None:
    fit = weibull(lives([54, *NIST_WEIBULL[1:]] + [500] * 10, [True] * 10 + [False] * 10))
    assert fit.shape == pytest.approx(1.7208, abs=5e-5)
    assert fit.scale == pytest.approx(606.528, abs=5e-4)


def test_weibull_with_suspensions_among_the_failures() -> None:
    """Abernethy, *The New Weibull Handbook*, app. C.5."""
    fit = weibull(lives([1500, 1750, 2250, 4000, 4300, 5000, 7000], [True, False, True, True, True, False, True]))
    assert fit.shape == pytest.approx(2.257, abs=5e-4)
    assert fit.scale == pytest.approx(4900.1, abs=0.05)


def test_weibull_of_the_ball_bearings() -> None:
    fit = weibull(lives(BEARINGS, [True] * 23))
    assert fit.shape == pytest.approx(2.102, abs=5e-4)
    assert fit.scale == pytest.approx(81.87, abs=5e-3)


def test_scipy_finds_the_same_weibull() -> None:
    shape, _, scale = stats.weibull_min.fit(BEARINGS, floc=0.0)
    fit = weibull(lives(BEARINGS, [True] * 23))
    assert fit.shape == pytest.approx(shape, rel=1e-4)
    assert fit.scale == pytest.approx(scale, rel=1e-4)


def test_scipy_finds_the_same_weibull_from_censored_records() -> None:
    data = stats.CensoredData(uncensored=NIST_WEIBULL, right=[500] * 10)
    shape, _, scale = stats.weibull_min.fit(data, floc=0.0)
    fit = weibull(lives(NIST_WEIBULL + [500] * 10, [True] * 10 + [False] * 10))
    assert fit.shape == pytest.approx(shape, rel=1e-3)
    assert fit.scale == pytest.approx(scale, rel=1e-3)


def test_scipy_finds_the_same_weibull_from_ages_between_looks() -> None:
    low, high = np.floor(np.array(BEARINGS) / 10.0) * 10.0, np.floor(np.array(BEARINGS) / 10.0) * 10.0 + 10.0
    data = stats.CensoredData.interval_censored(low, high)
    shape, _, scale = stats.weibull_min.fit(data, floc=0.0)
    fit = weibull(lives(high, [True] * 23, last_good=low))
    assert fit.shape == pytest.approx(shape, rel=1e-3)
    assert fit.scale == pytest.approx(scale, rel=1e-3)


def test_the_air_conditioning_data_are_those_of_the_paper() -> None:
    every = [age for group in PROSCHAN for age in group]
    assert (len(PROSCHAN), len(every), sum(every)) == (14, 205, 18_557)
    samples = [np.array(group, dtype=float) for group in PROSCHAN]
    assert stats.anderson_ksamp(samples, variant="right").statistic == pytest.approx(3.288, abs=5e-4)


def test_aircraft_that_differ_look_like_a_falling_hazard_together() -> None:
    """Proschan's point: each aircraft's hazard may be constant, yet the pooled intervals' hazard falls."""
    every = lives([age for group in PROSCHAN for age in group], [True] * 205)
    plain, fit = held_shape(every, shape=1.0), weibull(every)
    assert plain.scale == pytest.approx(18_557 / 205)
    shape, _, scale = stats.weibull_min.fit([age for group in PROSCHAN for age in group], floc=0.0)
    assert fit.shape < 1.0
    assert (fit.shape, fit.scale) == (pytest.approx(shape, rel=1e-3), pytest.approx(scale, rel=1e-3))


def test_power_law_of_the_military_handbook() -> None:
    trend = power_law(MIL_TIMES, end=300.0)
    assert trend.shape_likeliest == pytest.approx(0.716, abs=5e-4)
    assert 27 / 300.0**trend.shape_likeliest == pytest.approx(0.454, abs=5e-4)
    assert 300.0 / (27 * trend.shape_likeliest) == pytest.approx(15.5, abs=0.05)


def test_power_law_of_the_e_handbook() -> None:
    trend = power_law(NIST_REPAIRS, end=1500.0, confidence=0.8)
    assert trend.shape == pytest.approx(0.483506, abs=5e-7)
    assert trend.mean_between == pytest.approx(310.234, abs=5e-4)
    low, high = large_sample_limits(10, trend.mean_between, confidence=0.8)
    assert low == pytest.approx(157.7, abs=0.05)
    assert high == pytest.approx(548.6, abs=0.05)


@pytest.mark.parametrize(
    ("failures", "confidence", "low", "high"), [(23, 0.8, 0.6762, 1.5744), (27, 0.9, 0.6361467, 1.6817864)]
)
def test_exact_limits_of_the_mean_between_failures(failures: int, confidence: float, low: float, high: float) -> None:
    """Crow's coefficients for a fixed time, NASA TM-103511, tables 1B and 1C (as other libraries' tests quote them)."""
    trend = power_law(np.geomspace(1.0, 900.0, failures), end=1000.0, confidence=confidence)
    likeliest = 1000.0 / (failures * trend.shape_likeliest)
    digits = 5e-5 if low == 0.6762 else 5e-8
    assert trend.mean_between_low / likeliest == pytest.approx(low, abs=digits)
    assert trend.mean_between_high / likeliest == pytest.approx(high, abs=digits)


def test_best_age_to_replace() -> None:
    """Barlow and Proschan's equation; the figures are those of the ``reliability`` package's example."""
    best = best_age(shape=2.5, scale=1000.0, planned_cost=1.0, failed_cost=5.0)
    assert best.age == pytest.approx(493.047, abs=5e-4)
    assert best.cost_rate == pytest.approx(0.00346204, abs=5e-9)


@pytest.mark.parametrize(
    ("shape", "figures"), [(2.0, (0.184298, 0.624070, 1.637899)), (3.0, (0.085551, 0.531046, 1.559482))]
)
def test_renewals_of_a_weibull_of_mean_one(shape: float, figures: tuple[float, ...]) -> None:
    """Own figures by two methods; cf. Soland, *Operations Research* 16, 1968."""
    scale = 1.0 / math.gamma(1.0 + 1.0 / shape)
    found = renewals(np.array([0.5, 1.0, 2.0]), shape=shape, scale=scale)
    np.testing.assert_allclose(found, figures, atol=5e-7)
