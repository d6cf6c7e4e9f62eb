"""Stock at bases: limits that must hold, a small simulation of the same rules, and the best places."""

from __future__ import annotations

import itertools

import numpy as np
import pytest

from planner.stock.cover import Away, cover
from planner.stock.echelons import Base, base_cover, best_places, depot_owes
from sim.errors import RequestError

BASES = (Base("Home", 12 / 365, 0.0), Base("Dune", 8 / 365, 3.0), Base("Coast", 3 / 365, 2.0))


@pytest.mark.parametrize("method", ["metric", "two_moment", "exact"])
def test_a_full_depot_leaves_only_the_way(method: str) -> None:
    for base, found in zip(
        BASES, base_cover(BASES, repair_days=90, depot_stock=40, most=3, method=method), strict=True
    ):
        assert found.short_mean == pytest.approx(cover(Away(base.per_day * base.way_days), 3).short_mean, abs=1e-6)


def test_an_empty_depot_with_one_base_is_one_pipeline() -> None:
    """With one base and no depot stock all methods are exact: repair and way in a row."""
    for method in ("metric", "two_moment", "exact"):
        found = base_cover([Base("Home", 0.05, 4.0)], repair_days=90, depot_stock=0, most=12, method=method)[0]
        assert found.short_mean == pytest.approx(cover(Away(0.05 * 94.0), 12).short_mean, abs=1e-9)


def test_what_the_bases_wait_for_is_what_the_depot_owes_and_what_is_on_the_way() -> None:
    owed = depot_owes(BASES, repair_days=110, depot_stock=5)
    mean = float(np.arange(owed.size) @ owed)
    waited = sum(c.short_mean[0] for c in base_cover(BASES, repair_days=110, depot_stock=5, most=0))
    assert waited == pytest.approx(mean + sum(b.per_day * b.way_days for b in BASES))


def test_the_exact_law_is_what_engines_drawn_one_by_one_show() -> None:
    """300,000 independent looks: engines in repair, owed ones given to bases first come first served at random."""
    rng = np.random.default_rng(11)
    looks, stock = 300_000, 2
    rates = np.array([b.per_day for b in BASES])
    owed = np.maximum(0, rng.poisson(rates.sum() * 60, looks) - stock)
    share = rng.multinomial(owed, rates / rates.sum())
    way = rng.poisson(rates * np.array([b.way_days for b in BASES]), (looks, 3))
    short = np.maximum(0, share + way - 1)
    found = base_cover(BASES, repair_days=60, depot_stock=stock, most=1)
    for j, one in enumerate(found):
        error = short[:, j].std() / np.sqrt(looks)
        assert abs(short[:, j].mean() - one.short_mean[1]) < 3.5 * error


def test_best_places_equal_trying_every_split() -> None:
    bases = (Base("Home", 0.02, 0.0), Base("Dune", 0.06, 9.0), Base("Coast", 0.03, 14.0))
    found = best_places(bases, repair_days=25, total=6)
    for total in range(7):
        least = np.inf
        for split in itertools.product(range(total + 1), repeat=4):
            if sum(split) != total:
                continue
            covers = base_cover(bases, repair_days=25, depot_stock=split[0], most=max(split))
            least = min(least, sum(float(c.short_mean[n]) for c, n in zip(covers, split[1:], strict=True)))
        assert found[total].short_mean == pytest.approx(least, abs=1e-12)
        assert found[total].depot + sum(found[total].at_base) == total


def test_more_spares_in_all_never_leave_more_short() -> None:
    shorts = [p.short_mean for p in best_places(BASES, repair_days=110, total=12)]
    assert all(a >= b for a, b in itertools.pairwise(shorts))


def test_negative_stock_is_refused() -> None:
    with pytest.raises(RequestError, match="numbers from 0"):
        depot_owes(BASES, repair_days=90, depot_stock=-1)
    with pytest.raises(RequestError, match="0 or more"):
        best_places(BASES, repair_days=90, total=-1)
