"""The kernel of shared visits equals brute force on everything small enough to enumerate."""

import itertools

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.replacement import SharedVisits, first_overrun, replace_at_shared_visits, schedule_usd
from sim.errors import RequestError


def cheapest_of_all(lives: list[int], part_usd: np.ndarray, visit_usd: np.ndarray) -> float:
    """Return the least cost over every set of visits, each part solved by trying every subset of the visits."""
    steps = len(visit_usd)
    best = np.inf
    for visits in itertools.chain.from_iterable(
        itertools.combinations(range(1, steps + 1), n) for n in range(steps + 1)
    ):
        total = sum(visit_usd[step - 1] for step in visits)
        for part, life in enumerate(lives):
            options = [
                sum(part_usd[part, step - 1] for step in chosen)
                for n in range(len(visits) + 1)
                for chosen in itertools.combinations(visits, n)
                if all(b - a <= life for a, b in itertools.pairwise((0, *chosen, steps + 1)))
            ]
            total += min(options, default=np.inf)
        best = min(best, total)
    return best


@st.composite
def problems(draw: st.DrawFn) -> SharedVisits:
    parts, steps = draw(st.integers(1, 3)), draw(st.integers(1, 5))
    costs = st.integers(0, 20).map(float)
    constant = draw(st.booleans())
    width = 1 if constant else steps
    part_usd = draw(st.lists(st.lists(costs, min_size=width, max_size=width), min_size=parts, max_size=parts))
    visit_usd = draw(st.lists(costs, min_size=width, max_size=width))
    return SharedVisits(
        lives_steps=np.array(draw(st.lists(st.integers(1, 6), min_size=parts, max_size=parts))),
        part_usd=np.broadcast_to(np.array(part_usd), (parts, steps)).copy(),
        visit_usd=np.broadcast_to(np.array(visit_usd), (steps,)).copy(),
    )


@settings(max_examples=60, deadline=None, derandomize=True)
@given(problems())
def test_least_cost_equals_brute_force(problem: SharedVisits) -> None:
    answer = replace_at_shared_visits(problem)
    wanted = cheapest_of_all(problem.lives_steps.tolist(), problem.part_usd, problem.visit_usd)
    assert answer.cost_usd == pytest.approx(wanted, abs=1e-6)
    assert first_overrun(problem, answer.replaced) is None
    assert answer.relaxed_usd <= answer.cost_usd + 1e-6
    assert answer.cost_usd == schedule_usd(problem, answer.replaced)


def test_an_overrun_names_part_and_step() -> None:
    problem = SharedVisits(lives_steps=np.array([9, 2]), part_usd=np.ones((2, 4)), visit_usd=np.ones(4))
    assert first_overrun(problem, np.array([[0, 0, 0, 0], [0, 0, 1, 0]], dtype=bool)) == (1, 2)
    assert first_overrun(problem, np.array([[0, 0, 0, 0], [0, 1, 0, 1]], dtype=bool)) is None


@pytest.mark.parametrize(
    ("lives", "cost", "message"),
    [([0], 1.0, "a life of 0 steps"), ([2], -1.0, "cost below zero"), ([2, 2], 1.0, r"shape \(1, 3\)")],
)
def test_impossible_requests_are_refused(lives: list[int], cost: float, message: str) -> None:
    problem = SharedVisits(lives_steps=np.array(lives), part_usd=np.full((1, 3), cost), visit_usd=np.ones(3))
    with pytest.raises(RequestError, match=message):
        replace_at_shared_visits(problem)
