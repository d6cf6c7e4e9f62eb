"""Simple rules are feasible plans: never cheaper than the best one, and each does what its name says."""

import dataclasses

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.build_kernel import open_at_best
from planner.build_rules import best_goal, play
from planner.openings import Install, Openings
from sim.errors import NoSolutionError


def engine(*, lives: tuple[int, ...], left: tuple[int, ...], wear: float, steps: int = 8) -> Openings:
    """Two modules, the second behind the first; parts lie by turns in both; only the second wears."""
    ages = np.maximum(np.arange(steps + 1)[None, :] - np.arange(steps)[:, None], 0)
    installs = [
        Install(part, at, min(steps, at + life), 10.0 + part) for part, life in enumerate(lives) for at in range(steps)
    ]
    wears = np.array([0.0, wear])
    return Openings(
        visit_usd=np.full(steps, 30.0),
        open_usd=np.full((2, steps), 4.0),
        run_usd=np.full((2, steps, steps + 1), 15.0),
        first_run_usd=np.zeros((2, steps + 1)),
        run_loss_degC=wears[:, None, None] * ages[None],
        first_loss_degC=wears[:, None] * (np.arange(steps + 1) + 1.0),
        budget_degC=np.full(steps + 1, 10.0),
        in_front=np.array([[False, False], [True, False]]),
        part_module=np.arange(len(lives)) % 2,
        keep_until=np.array(left),
        keep_usd=np.zeros(len(lives)),
        installs=tuple(installs),
        must_visit=True,
    )


engines = st.builds(
    engine,
    lives=st.tuples(*[st.integers(2, 9)] * 3),
    left=st.tuples(*[st.integers(0, 8)] * 3),
    wear=st.floats(0, 4.9),
)


@settings(max_examples=25, deadline=None, derandomize=True)
@given(engines, st.sampled_from(["run_out", "exposed_only", "hard_goal"]), st.integers(1, 8))
def test_no_rule_is_cheaper_than_the_best_plan(problem: Openings, rule: str, goal: int) -> None:
    assert play(problem, rule, goal_steps=goal).cost_usd >= open_at_best(problem).cost_usd - 1e-6


@settings(max_examples=50, deadline=None, derandomize=True)
@given(engines, st.sampled_from(["run_out", "exposed_only", "hard_goal"]), st.integers(1, 8))
def test_no_rule_passes_a_limit_or_the_margin(problem: Openings, rule: str, goal: int) -> None:
    played = play(problem, rule, goal_steps=goal)
    steps = problem.visit_usd.size
    for part, left in enumerate(problem.keep_until):
        until = left
        for step in range(steps):
            until = max([until, *(one.until for one in played.installs if one.part == part and one.at == step)])
            assert step < until
    for point in range(1, steps + 1):
        times = np.flatnonzero(played.restored[1, :point])
        lost = problem.run_loss_degC[1, times[-1], point] if times.size else problem.first_loss_degC[1, point]
        assert lost <= problem.budget_degC[point] + 1e-6


def test_run_out_does_nothing_early() -> None:
    played = play(engine(lives=(9, 9, 9), left=(3, 5, 8), wear=0.0), "run_out")
    assert [(one.part, one.at) for one in played.installs] == [(0, 3), (1, 5)]


def test_exposed_only_takes_what_is_open() -> None:
    """Part 1 forces the rear module open at step 3, and with it the front module and its parts 0 and 2."""
    played = play(engine(lives=(9, 9, 9), left=(5, 3, 8), wear=0.0), "exposed_only", goal_steps=4)
    assert [(one.part, one.at) for one in played.installs] == [(0, 3), (1, 3)]


def test_hard_goal_opens_for_what_does_not_reach_it() -> None:
    played = play(engine(lives=(9, 9, 9), left=(3, 5, 8), wear=0.0), "hard_goal", goal_steps=5)
    assert [(one.part, one.at) for one in played.installs] == [(0, 0), (1, 5)]


def test_best_goal_is_the_cheapest_of_those_tried() -> None:
    problem = engine(lives=(6, 5, 9), left=(3, 2, 4), wear=1.0)
    goal, played = best_goal(problem, "hard_goal", goals_steps=(1, 2, 4, 8))
    costs = {g: play(problem, "hard_goal", goal_steps=g).cost_usd for g in (1, 2, 4, 8)}
    assert played.cost_usd == costs[goal] == min(costs.values())


def test_a_rule_that_cannot_go_on_says_so() -> None:
    problem = engine(lives=(9, 9, 9), left=(3, 5, 8), wear=0.0)
    with pytest.raises(NoSolutionError, match="part 0 has no new part"):
        play(dataclasses.replace(problem, installs=()), "run_out")
    with pytest.raises(NoSolutionError, match="nothing that can be done at point 0"):
        play(engine(lives=(9, 9, 9), left=(8, 8, 8), wear=11.0), "run_out")
