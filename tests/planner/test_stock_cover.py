"""Laws of the number away: their moments, their tails, and what stocks do to them."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy import stats

from planner.stock.cover import (
    Away,
    chances,
    cover,
    cover_of_law,
    covers,
    enough,
    least_spread,
    stock_for,
    sum_of_chances,
)
from sim.errors import RequestError

means = st.floats(0.01, 40.0)


@settings(max_examples=200, deadline=None)
@given(mean=means, spread=st.floats(0.0, 4.0))
def test_a_law_has_the_mean_and_spread_asked_for(mean: float, spread: float) -> None:
    law = chances(Away(mean, spread), 900)
    x = np.arange(law.size)
    assert law.min() >= 0.0
    assert law.sum() == pytest.approx(1.0, abs=1e-9)
    assert x @ law == pytest.approx(mean, rel=1e-7)
    variance = x**2 @ law - (x @ law) ** 2
    assert variance / mean == pytest.approx(max(spread, least_spread(mean)), abs=1e-5)


@settings(max_examples=100, deadline=None)
@given(mean=means, spread=st.floats(0.0, 3.0))
def test_one_more_spare_never_covers_less_and_saves_less_each_time(mean: float, spread: float) -> None:
    away = Away(mean, spread)
    found = cover(away, enough(away))
    assert (np.diff(found.cover_frac) >= -1e-12).all()
    assert (np.diff(found.short_mean) <= 1e-12).all()
    assert (np.diff(found.short_mean, 2) >= -1e-9).all()
    assert found.short_mean[0] == pytest.approx(mean)
    assert found.cover_frac[-1] > 1.0 - 1e-9
    assert found.short_mean[-1] < 1e-6


def test_the_three_laws_are_those_of_the_books() -> None:
    x = np.arange(30)
    assert chances(Away(4.37), 29) == pytest.approx(stats.poisson.pmf(x, 4.37), abs=1e-14)
    assert chances(Away(6.0, 1.5), 29) == pytest.approx(stats.nbinom.pmf(x, 12.0, 1.0 / 1.5), abs=1e-13)
    assert chances(Away(6.0, 0.4), 29) == pytest.approx(stats.binom.pmf(x, 10, 0.6), abs=1e-12)


def test_shortage_is_the_sum_beyond_the_stock() -> None:
    law = stats.poisson.pmf(np.arange(200), 4.37)
    found = cover(Away(4.37), 9)
    for stock in (0, 3, 9):
        beyond = sum((x - stock) * law[x] for x in range(stock + 1, 200))
        assert found.short_mean[stock] == pytest.approx(beyond, abs=1e-12)


@pytest.mark.parametrize("spread", [0.5, 1.0, 1.8])
def test_many_means_at_once_are_each_of_them(spread: float) -> None:
    several = np.array([[0.0, 0.4, 3.0], [7.5, 20.0, 90.0]])
    found = covers(several, 40, spread=spread)
    assert found.cover_frac.shape == (2, 3, 41)
    for i, j in np.ndindex(several.shape):
        one = cover(Away(float(several[i, j]), spread), 40)
        assert found.cover_frac[i, j] == pytest.approx(one.cover_frac, abs=1e-10)
        assert found.short_mean[i, j] == pytest.approx(one.short_mean, abs=1e-8)


def test_a_wider_spread_needs_more_spares_for_the_same_cover() -> None:
    stocks = [stock_for(Away(5.3, spread), 0.95) for spread in (0.2, 0.6, 1.0, 1.5, 2.5)]
    assert stocks == sorted(stocks)
    assert stocks[0] < stocks[2] < stocks[-1]


def test_independent_chances_add_up_to_the_law_of_every_outcome() -> None:
    chance = np.array([0.1, 0.9, 0.5, 0.33])
    law = np.zeros(5)
    for outcome in range(16):
        happened = [bool(outcome >> i & 1) for i in range(4)]
        law[sum(happened)] += np.prod([p if yes else 1.0 - p for p, yes in zip(chance, happened, strict=True)])
    assert sum_of_chances(chance) == pytest.approx(law, abs=1e-15)
    found = cover_of_law(law)
    assert found.short_mean[0] == pytest.approx(chance.sum())
    assert found.short_mean[-1] == pytest.approx(0.0, abs=1e-12)


@pytest.mark.parametrize("target", [1.0, 1.2, -0.1])
def test_a_target_that_no_stock_reaches_is_refused(target: float) -> None:
    with pytest.raises(RequestError, match="below 100 %"):
        stock_for(Away(3.0), target)


def test_a_mean_below_zero_is_refused() -> None:
    with pytest.raises(RequestError, match="numbers from 0"):
        chances(Away(-1.0), 5)
