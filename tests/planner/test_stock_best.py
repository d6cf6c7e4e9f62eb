"""Best stocks: a case worked by hand, brute force, and what more money can do."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.stock import best
from planner.stock.best import Item, efficient, greedy
from planner.stock.cover import Away, cover, enough
from sim.errors import RequestError


def item(name: str, price: float, *loss: float, least: int = 0) -> Item:
    return Item(name=name, price=price, loss=np.array(loss, dtype=float), least=least)


def test_two_items_worked_by_hand() -> None:
    """Stock of a at 3 each saves 6, 3, 1; of b at 5 each saves 8, 2.

    Efficient: nothing (18), a (12 for 3), b (10 for 5), 2a (9 for 6), a + b (4 for 8), 2a + b (1 for 11), 3a + b
    (0 for 14) and 2a + 2b (-1 for 16), 3a + 2b (-2 for 19).
    """
    choices = efficient([item("a", 3, 10, 4, 1, 0), item("b", 5, 8, 0, -2)], budget=100)
    assert choices.cost.tolist() == [0, 3, 5, 6, 8, 11, 14, 16, 19]
    assert choices.loss.tolist() == [18, 12, 10, 9, 4, 1, 0, -1, -2]
    assert choices.stocks.tolist() == [[0, 0], [1, 0], [0, 1], [2, 0], [1, 1], [2, 1], [3, 1], [2, 2], [3, 2]]
    assert choices.stocks[choices.under(10)].tolist() == [1, 1]
    assert choices.stocks[choices.under(11)].tolist() == [2, 1]
    assert choices.stocks[choices.for_loss(5)].tolist() == [1, 1]


@st.composite
def problems(draw: st.DrawFn) -> list[Item]:
    found = []
    for n in range(draw(st.integers(1, 4))):
        drops = draw(st.lists(st.floats(0.0, 3.0), min_size=0, max_size=3))
        loss = np.concatenate([[0.0], -np.cumsum(drops)]) if drops else np.zeros(1)
        price = draw(st.integers(1, 12)) + draw(st.sampled_from([0.0, 0.37]))
        least = draw(st.integers(0, loss.size - 1))
        found.append(Item(name=str(n), price=price, loss=loss, least=least))
    return found


def every_choice(items: list[Item], budget: float) -> list[tuple[float, float]]:
    ranges = [range(one.least, one.loss.size) for one in items]
    sums = [
        (
            sum(one.price * n for one, n in zip(items, stock, strict=True)),
            sum(float(one.loss[n]) for one, n in zip(items, stock, strict=True)),
        )
        for stock in itertools.product(*ranges)
    ]
    return [(cost, loss) for cost, loss in sums if cost <= budget + 1e-9]


@settings(max_examples=150, deadline=None)
@given(items=problems(), extra=st.floats(0.0, 60.0), prune_from=st.sampled_from([0, 10**9]))
def test_every_efficient_choice_of_brute_force_is_found(items: list[Item], extra: float, prune_from: int) -> None:
    held = sum(one.price * one.least for one in items)
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(best, "_PRUNE_FROM", prune_from)
        choices = efficient(items, budget=held + extra)
    found = every_choice(items, held + extra)
    for cost, loss, stock in zip(choices.cost, choices.loss, choices.stocks, strict=True):
        assert cost == pytest.approx(sum(one.price * n for one, n in zip(items, stock, strict=True)))
        assert loss == pytest.approx(min(other for price, other in found if price <= cost + 1e-9), abs=1e-9)
    for cost, loss in found:
        assert choices.loss[choices.under(cost)] <= loss + 1e-9


@settings(max_examples=60, deadline=None)
@given(items=problems(), budget=st.floats(0.0, 60.0))
def test_greedy_is_never_better(items: list[Item], budget: float) -> None:
    held = sum(one.price * one.least for one in items)
    choices, walk = efficient(items, budget=held + budget), greedy(items, budget=held + budget)
    assert choices.loss[-1] <= walk.loss[-1] + 1e-9


def test_dropping_hopeless_sums_changes_nothing_on_twenty_items(monkeypatch: pytest.MonkeyPatch) -> None:
    rng = np.random.default_rng(7)
    items = [
        Item(name=str(n), price=float(price), loss=cover(Away(float(mean)), enough(Away(float(mean)))).short_mean)
        for n, (price, mean) in enumerate(
            zip(rng.integers(400_000, 9_000_000, 20), rng.uniform(0.1, 1.5, 20), strict=True)
        )
    ]
    monkeypatch.setattr(best, "_PRUNE_FROM", 10**9)
    whole = efficient(items, budget=4e7)
    monkeypatch.setattr(best, "_PRUNE_FROM", 50)
    pruned = efficient(items, budget=4e7)
    assert whole.cost.size > 50
    assert pruned.cost.tolist() == pytest.approx(whole.cost.tolist())
    assert pruned.loss.tolist() == pytest.approx(whole.loss.tolist())
    assert (pruned.stocks == whole.stocks).all()


def test_more_money_never_leaves_more_short() -> None:
    items = [Item(name=str(m), price=3.0 + m, loss=cover(Away(m), 12).short_mean) for m in (0.4, 1.7, 3.1)]
    losses = [efficient(items, budget=float(b)).loss[-1] for b in range(0, 60, 4)]
    assert all(a >= b for a, b in itertools.pairwise(losses))


def test_a_budget_below_what_is_held_is_refused() -> None:
    with pytest.raises(RequestError, match="what is held"):
        efficient([item("a", 3, 5, 2, 1, least=2)], budget=5.0)


def test_a_loss_that_rises_and_a_price_of_nothing_are_refused() -> None:
    with pytest.raises(RequestError, match="rises with stock"):
        efficient([item("a", 3, 1, 2)], budget=5.0)
    with pytest.raises(RequestError, match="more than 0"):
        efficient([item("a", 0, 2, 1)], budget=5.0)


def test_a_target_out_of_reach_is_refused_with_what_is_in_reach() -> None:
    choices = efficient([item("a", 3, 5, 2, 1)], budget=100)
    with pytest.raises(RequestError, match="at least 1, the best"):
        choices.for_loss(0.5)
