"""The stopping rule: when it looks, what it says, and that its intervals cover what they promise."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from planner.sequential import (
    cheaper_chance,
    expected_runs,
    judge,
    looks,
    luck_saved,
    paired_interval,
    percentiles,
    plain_verdict,
)
from sim.errors import RequestError


def test_it_looks_at_doubling_numbers_of_runs_and_last_at_the_most_allowed() -> None:
    assert looks() == (16, 32, 64, 128, 256, 512, 1024)
    assert looks(most=100) == (16, 32, 64, 100)
    assert looks(most=16) == (16,)
    assert looks(most=10) == (10,)
    with pytest.raises(RequestError, match="most runs: found 1, expected 2 or more"):
        looks(most=1)


@given(st.integers(2, 5000))
def test_looks_rise_and_end_with_the_most(most: int) -> None:
    planned = looks(most=most)
    assert list(planned) == sorted(set(planned))
    assert planned[-1] == most


def _totals(differences: list[float], base: float = 1000.0) -> dict[str, np.ndarray]:
    b = np.full(len(differences), base)
    return {"a": b + np.array(differences), "b": b}


def test_it_stops_when_the_half_width_is_below_the_share_of_total_cost() -> None:
    totals = _totals([1.0, -1.0] * 8)
    assert judge(totals, precision_frac=0.01, planned=looks()).reason == "precise"
    assert not judge(totals, precision_frac=0.0001, planned=looks()).stop


def test_it_stops_when_the_sign_is_clear() -> None:
    verdict = judge(_totals([50.0, 60.0] * 8), precision_frac=0.0001, planned=looks())
    assert verdict.stop
    assert verdict.reason == "sign"
    assert verdict.pairs["a", "b"].low > 0.0


def test_three_strategies_go_on_until_every_pair_is_settled() -> None:
    luck = np.random.default_rng(1).normal(0.0, 100.0, 16)
    totals = {"a": 1000.0 + luck * 0.0, "b": 2000.0 + luck, "c": 2000.0 - luck}
    verdict = judge(totals, precision_frac=0.0001, planned=looks())
    assert list(verdict.pairs) == [("a", "b"), ("a", "c"), ("b", "c")]
    assert verdict.pairs["a", "b"].high < 0.0
    assert not verdict.stop


def test_the_look_at_which_it_will_stop_is_foretold_from_the_spread() -> None:
    """A half-width falls with the root of the runs: three times too wide at 16 runs is narrow enough at 144."""
    luck = np.random.default_rng(5).normal(0.0, 1.0, 16)
    totals = _totals(list(luck - luck.mean()))
    half = judge(totals, precision_frac=1e-9, planned=looks()).pairs["a", "b"].half_width
    for times, look in ((0.9, 16), (1.3, 32), (3.0, 256), (100.0, 1024)):
        precision = half / times / float(np.mean([totals["a"], totals["b"]]))
        assert expected_runs(totals, precision_frac=precision, planned=looks()) == look


def test_one_strategy_alone_is_judged_by_its_own_total() -> None:
    totals = {"a": np.array([990.0, 1010.0] * 8)}
    assert judge(totals, precision_frac=0.01, planned=looks()) == (True, "precise", {})
    assert judge(totals, precision_frac=0.001, planned=looks()) == (False, "more", {})


def test_it_ends_at_the_most_runs_and_says_so() -> None:
    assert judge(_totals([1.0, -1.0] * 8), precision_frac=0.0, planned=(16,)).reason == "most"


def test_a_fixed_number_of_runs_has_the_plain_interval() -> None:
    totals = _totals([1.0, 2.0, 3.0, 4.0])
    assert plain_verdict(totals, reason="fixed").pairs["a", "b"] == paired_interval(totals["a"], totals["b"])
    assert paired_interval([1.0], [2.0]).mean == -1.0
    assert math.isnan(paired_interval([1.0], [2.0]).low)


def test_percentiles_are_named_from_forty_values_on() -> None:
    assert percentiles(np.arange(39.0)) == (None, None, None)
    assert percentiles(np.arange(41.0)) == (4.0, 20.0, 36.0)


def test_the_chance_to_be_cheaper_counts_runs_and_halves_ties() -> None:
    assert cheaper_chance([1.0, 2.0, 3.0, 4.0], [2.0, 2.0, 2.0, 5.0]) == 0.625


def test_what_common_luck_saved_is_measured() -> None:
    rng = np.random.default_rng(2)
    common, a, b = rng.normal(0.0, 3.0, 20_000), rng.normal(0.0, 1.0, 20_000), rng.normal(0.0, 1.0, 20_000)
    assert luck_saved(common + a, common + b) == pytest.approx(10.0, rel=0.05)
    assert luck_saved(a, b) == pytest.approx(1.0, rel=0.05)
    assert luck_saved(a, a + 1.0) > 1e20


def _coverage(draw: object, *, mean: float, studies: int, precision_frac: float) -> tuple[float, float]:
    """Run the rule on a model whose true difference is known; return the share that covers it and the mean runs."""
    planned = looks(most=256)
    hits = runs = 0
    for _ in range(studies):
        differences = draw(256)
        for look in planned:
            verdict = judge(
                {"a": 1000.0 + differences[:look], "b": np.full(look, 1000.0)},
                precision_frac=precision_frac,
                planned=planned,
            )
            if verdict.stop:
                break
        pair = verdict.pairs["a", "b"]
        hits += pair.low <= mean <= pair.high
        runs += pair.runs
    return hits / studies, runs / studies


def test_stopping_early_keeps_the_coverage_on_a_model_with_a_known_answer() -> None:
    """400 studies: by chance alone a rule of exactly 95 % would fall below 0.92 once in some 300 tries."""
    rng = np.random.default_rng(3)
    covered, runs = _coverage(lambda n: rng.normal(4.0, 20.0, n), mean=4.0, studies=400, precision_frac=0.003)
    assert covered >= 0.95
    assert 16 < runs < 256


@pytest.mark.long
@pytest.mark.parametrize("mean", [0.0, 2.0, 5.0, 20.0])
@pytest.mark.parametrize("precision_frac", [0.0, 0.005, 0.01])
@pytest.mark.parametrize("law", ["normal", "gamma"])
def test_coverage_over_means_precisions_and_skewed_differences(law: str, mean: float, precision_frac: float) -> None:
    """Differences of gamma variates of shape 4 are skewed as costs are; 4,000 studies: standard error 0.35 %."""
    rng = np.random.default_rng(4)

    def draw(n: int) -> np.ndarray:
        return rng.normal(mean, 20.0, n) if law == "normal" else mean + 10.0 * (rng.gamma(4.0, 1.0, n) - 4.0)

    covered, runs = _coverage(draw, mean=mean, studies=4000, precision_frac=precision_frac)
    print(f"{law} mean {mean} precision {precision_frac}: covered {covered:.4f}, runs {runs:.1f}")
    assert covered >= 0.95 - 3 * 0.0035
