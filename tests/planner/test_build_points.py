"""Lives, wear and prices become points without ever passing a limit; a two-part engine is worked by hand."""

import dataclasses

import numpy as np
import pytest

from planner.build_kernel import open_at_best
from planner.build_points import BuildModule, BuildPart, BuildProblem, UsedPart, openings_of, points_of, used_serials
from sim.errors import RequestError


def flat(usd: float):
    return lambda _: usd


def module(**change: object) -> BuildModule:
    plain = BuildModule(
        module="HPT",
        module_serial="HPT-1",
        in_front=(),
        open=flat(10_000),
        restore=flat(100_000),
        age_cycles=0,
        loss_now=lambda cycles: 0.001 * cycles,
        loss_after=lambda cycles: 0.001 * cycles,
        end=flat(0),
    )
    return dataclasses.replace(plain, **change)


def part(**change: object) -> BuildPart:
    plain = BuildPart(
        part_serial="D1",
        part_number="DISK",
        module=0,
        left_cycles=2_000,
        life=flat(10_000),
        price=flat(300_000),
        end=lambda left: 30.0 * left,
    )
    return dataclasses.replace(plain, **change)


def engine(**change: object) -> BuildProblem:
    plain = BuildProblem(
        modules=(module(),), parts=(part(),), end_cycles=6_000, visit=flat(50_000), budget_degC=flat(20.0)
    )
    return dataclasses.replace(plain, **change)


def test_points_hold_the_present_limits_and_the_margin_exactly() -> None:
    problem = engine(parts=(part(), part(left_cycles=2_345)), budget_degC=flat(4.1))
    assert points_of(problem, step_cycles=1_000) == (0, 1_000, 2_000, 2_345, 3_000, 4_100, 5_000, 6_000)


def test_a_life_is_counted_down_to_the_last_point_it_reaches() -> None:
    arrays = openings_of(engine(parts=(part(life=flat(2_999)),)), points=(0, 1_000, 2_000, 3_000, 6_000))
    assert arrays.keep_until.tolist() == [2]
    assert [(one.at, one.until) for one in arrays.installs] == [(0, 2), (1, 3), (2, 3)]


def test_one_part_worked_by_hand() -> None:
    """The part goes at its limit of 2,000; the new one has 6,000 of 10,000 left at the end, worth 180,000 USD."""
    problem = engine()
    best = open_at_best(openings_of(problem, points=points_of(problem, step_cycles=1_000)))
    assert best.cost_usd == pytest.approx(50_000 + 10_000 + 300_000 - 30 * 6_000)
    assert [one.at for one in best.installs] == [2]


def test_a_used_part_of_just_enough_life_is_taken() -> None:
    used = UsedPart("D9", flat(4_000), flat(90_000))
    problem = engine(parts=(part(used=(used,)),))
    best = open_at_best(openings_of(problem, points=points_of(problem, step_cycles=1_000)))
    assert used_serials(problem) == ("D9",)
    assert [(one.at, one.stock) for one in best.installs] == [(2, 0)]
    assert best.cost_usd == pytest.approx(50_000 + 10_000 + 90_000)


def test_a_used_part_that_comes_too_late_is_not() -> None:
    used = UsedPart("D9", flat(4_000), flat(90_000), from_cycles=2_500)
    problem = engine(parts=(part(used=(used,)),))
    best = open_at_best(openings_of(problem, points=points_of(problem, step_cycles=1_000)))
    assert [one.stock for one in best.installs] == [-1]


def test_the_last_run_asks_for_its_own_margin() -> None:
    """6 degC are lost by the end; with 5 allowed there the module is restored once."""
    problem = engine(parts=(), end_budget_degC=5.0)
    best = open_at_best(openings_of(problem, points=points_of(problem, step_cycles=1_000)))
    assert best.cost_usd == pytest.approx(50_000 + 10_000 + 100_000)
    assert open_at_best(openings_of(engine(parts=()), points=(0.0, 6_000.0))).cost_usd == 0


def test_expected_distress_decides_for_an_early_restoration() -> None:
    risky = module(risk=lambda age: (age / 6_000) ** 3, risk_usd=flat(1_000_000))
    problem = engine(modules=(risky,), parts=())
    best = open_at_best(openings_of(problem, points=points_of(problem, step_cycles=1_000)))
    once = 160_000 + 1_000_000 * 2 * 0.5**3
    twice = 320_000 + 1_000_000 * 3 * (1 / 3) ** 3
    assert best.cost_usd == pytest.approx(min(once, twice, 1_000_000))


def test_a_step_that_cannot_be_is_refused() -> None:
    with pytest.raises(RequestError, match="step: found 0 cycles"):
        points_of(engine(), step_cycles=0)


def test_arrays_have_the_shapes_that_the_kernel_asks_for() -> None:
    arrays = openings_of(engine(), points=(0.0, 2_000.0, 6_000.0))
    assert arrays.run_usd.shape == (1, 2, 3)
    assert np.isfinite(arrays.run_usd).all()
