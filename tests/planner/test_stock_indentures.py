"""Engines and modules together: brute force, limits, and monotone in every stock."""

from __future__ import annotations

import itertools

import numpy as np
import pytest

from planner.stock.cover import Away, cover
from planner.stock.indentures import (
    EngineDemand,
    Holding,
    ModuleDemand,
    cheapest_for,
    efficient_holdings,
    holding,
)
from sim.errors import NoSolutionError, RequestError

ENGINE = EngineDemand(engine_type="N", means=np.array([1.4, 2.3]), price_usd=11.5)
MODULES = (
    ModuleDemand(module="HPT", per_day=4 / 365, back_days=95.0, price_usd=2.3, longer_days=70.0),
    ModuleDemand(module="LPT", per_day=2 / 365, back_days=80.0, price_usd=1.5),
)


def every_holding(budget: float) -> list[Holding]:
    found = []
    for engines, hpt, lpt in itertools.product(range(9), range(6), range(6)):
        one = holding(ENGINE, MODULES, engines=engines, stocks=(hpt, lpt))
        if one.price_usd <= budget + 1e-9:
            found.append(one)
    return found


def test_the_curve_holds_exactly_what_brute_force_cannot_beat() -> None:
    curve = efficient_holdings(ENGINE, MODULES, budget_usd=70.0)
    everything = every_holding(70.0)
    for one in curve:
        best = max(other.cover_frac for other in everything if other.price_usd <= one.price_usd + 1e-9)
        assert one.cover_frac == pytest.approx(best, abs=1e-12)
    for other in everything:
        at_most = [one for one in curve if one.price_usd <= other.price_usd + 1e-9]
        assert at_most[-1].cover_frac >= other.cover_frac - 1e-12


def test_without_modules_the_curve_is_palms() -> None:
    engine = EngineDemand(engine_type="N", means=np.array([4.37]), price_usd=1.0)
    curve = efficient_holdings(engine, (), budget_usd=9.0)
    assert [one.cover_frac for one in curve] == pytest.approx(cover(Away(4.37), 9).cover_frac.tolist())


def test_a_shelf_that_is_never_empty_adds_no_engine() -> None:
    full = holding(ENGINE, MODULES, engines=3, stocks=(40, 40))
    assert full.added_mean == pytest.approx(0.0, abs=1e-9)
    assert full.short_mean == pytest.approx(np.mean([cover(Away(m), 3).short_mean[3] for m in ENGINE.means]))


def test_an_empty_shelf_makes_every_engine_wait_or_go_whole() -> None:
    """Waiting: rate times days back. Going whole: rate times the days that it is away longer."""
    empty = holding(ENGINE, MODULES, engines=0, stocks=(0, 0))
    assert empty.added_mean == pytest.approx(4 / 365 * 70.0 + 2 / 365 * 80.0)


@pytest.mark.parametrize("which", [0, 1, 2])
def test_one_more_of_anything_never_covers_less(which: int) -> None:
    for stocks in itertools.product(range(4), repeat=3):
        more = tuple(n + (i == which) for i, n in enumerate(stocks))
        now = holding(ENGINE, MODULES, engines=stocks[0], stocks=stocks[1:])
        then = holding(ENGINE, MODULES, engines=more[0], stocks=more[1:])
        assert then.cover_frac >= now.cover_frac - 1e-12
        assert then.short_mean <= now.short_mean + 1e-12


def test_longer_turn_times_and_more_removals_never_cover_more() -> None:
    slower = [ModuleDemand(module=m.module, per_day=m.per_day, back_days=m.back_days * 1.2, price_usd=1.0,
                           longer_days=m.longer_days) for m in MODULES]  # fmt: skip
    more = EngineDemand(engine_type="N", means=ENGINE.means * 1.2, price_usd=11.5)
    now = holding(ENGINE, MODULES, engines=3, stocks=(1, 1))
    assert holding(ENGINE, slower, engines=3, stocks=(1, 1)).cover_frac < now.cover_frac
    assert holding(more, MODULES, engines=3, stocks=(1, 1)).cover_frac < now.cover_frac


def test_the_cheapest_for_a_target_reaches_it_and_nothing_cheaper_does() -> None:
    curve = efficient_holdings(ENGINE, MODULES, budget_usd=120.0)
    best = cheapest_for(curve, 0.92)
    assert best.cover_frac >= 0.92
    assert all(o.cover_frac < 0.92 for o in every_holding(best.price_usd - 1e-6))


def test_keeping_what_is_held_starts_the_curve_there() -> None:
    engine = EngineDemand(engine_type="N", means=ENGINE.means, price_usd=11.5, held=2)
    modules = (MODULES[0], ModuleDemand(module="LPT", per_day=2 / 365, back_days=80.0, price_usd=1.5, held=2))
    curve = efficient_holdings(engine, modules, budget_usd=60.0, keep=True)
    assert curve[0].price_usd == pytest.approx(2 * 11.5 + 2 * 1.5)
    assert all(one.engines >= 2 and one.modules[1] >= 2 for one in curve)
    with pytest.raises(RequestError, match="what is held"):
        efficient_holdings(engine, modules, budget_usd=20.0, keep=True)


def test_targets_and_stocks_that_cannot_be_are_refused() -> None:
    curve = efficient_holdings(ENGINE, MODULES, budget_usd=30.0)
    with pytest.raises(NoSolutionError, match="the best within the budget"):
        cheapest_for(curve, 0.999)
    with pytest.raises(RequestError, match="below 100 %"):
        cheapest_for(curve, 1.0)
    with pytest.raises(RequestError, match="numbers from 0"):
        holding(ENGINE, MODULES, engines=-1, stocks=(0, 0))


def test_spares_that_are_owed_are_taken_off_the_stock_of_their_period() -> None:
    """Two periods; in the second one spare fills a position for good: its cover is that of one spare fewer."""
    engine = EngineDemand(engine_type="N", means=np.array([2.0, 2.0]), price_usd=1.0, taken=np.array([0, 1]))
    found = engine.cover(np.zeros(1), 5)
    plain = cover(Away(2.0), 5)
    assert found.cover_frac[0, 3] == pytest.approx((plain.cover_frac[3] + plain.cover_frac[2]) / 2)
    assert found.cover_frac[0, 0] == pytest.approx(plain.cover_frac[0] / 2)
    assert found.short_mean[0, 0] == pytest.approx((2.0 + 3.0) / 2)


def test_engines_that_are_freed_add_to_the_stock_of_their_period() -> None:
    engine = EngineDemand(engine_type="N", means=np.array([2.0]), price_usd=1.0, taken=np.array([-2]))
    found = engine.cover(np.zeros(1), 3)
    assert found.cover_frac[0] == pytest.approx(cover(Away(2.0), 5).cover_frac[2:])
