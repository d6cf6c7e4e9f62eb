"""The assignment kernel equals brute force, and names what blocks when nothing fits."""

import itertools

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.assignment import Choices, Chosen, Relaxation, Together, choose
from sim.errors import RequestError


def fits(problem: Choices, options: tuple[int, ...]) -> bool:
    taken = [0] * len(problem.capacity)
    for option, resource, count in problem.uses:
        taken[resource] += count * (option in options)
    return (
        all(have >= want for have, want in zip(problem.capacity, taken, strict=True))
        and all(lock in options for lock in problem.locked)
        and all(option not in options or any(n in options for n in needed) for option, needed in problem.needs)
    )


def every_choice(problem: Choices) -> list[tuple[int, ...]]:
    answers = [[o for o, d in enumerate(problem.demand) if d == demand] for demand in range(problem.demands)]
    return [options for options in itertools.product(*answers) if fits(problem, options)]


def cost_of(problem: Choices, options: tuple[int, ...]) -> float:
    pairs = sum(p.usd for p in problem.together if all(any(o in options for o in one) for one in p.sets))
    return sum(problem.cost_usd[o] for o in options) + pairs


@st.composite
def problems(draw: st.DrawFn) -> Choices:
    demands, resources = draw(st.integers(1, 4)), draw(st.integers(0, 3))
    demand = [d for d in range(demands) for _ in range(draw(st.integers(1, 4)))]
    some = st.integers(0, len(demand) - 1)
    of = {d: tuple(o for o, e in enumerate(demand) if e == d) for d in range(demands)}
    pairs = []
    for a, b in itertools.combinations(range(demands), 2):
        if draw(st.booleans()):
            half = (of[a][: draw(st.integers(1, len(of[a])))], of[b][: draw(st.integers(1, len(of[b])))])
            pairs.append(Together(half, draw(st.integers(0, 9))))
    uses = st.tuples(some, st.integers(0, max(0, resources - 1)), st.integers(1, 2))
    return Choices(
        demands=demands,
        demand=np.array(demand),
        cost_usd=np.array(draw(st.lists(st.integers(-5, 20), min_size=len(demand), max_size=len(demand))), dtype=float),
        capacity=np.array(draw(st.lists(st.integers(0, 3), min_size=resources, max_size=resources)), dtype=np.int64),
        uses=tuple(draw(st.lists(uses, max_size=8))) if resources else (),
        needs=tuple(draw(st.lists(st.tuples(some, st.lists(some, max_size=2).map(tuple)), max_size=2))),
        together=tuple(pairs),
        locked=tuple(draw(st.lists(some, max_size=1))),
    )


@settings(max_examples=150, deadline=None, derandomize=True)
@given(problems())
def test_the_cheapest_choice_equals_brute_force(problem: Choices) -> None:
    everything = every_choice(problem)
    answer = choose(problem)
    if not everything:
        assert isinstance(answer, tuple)
        assert not isinstance(answer, Chosen)
        assert len(answer) > 0
        return
    assert isinstance(answer, Chosen)
    assert tuple(answer.options) in everything
    assert answer.cost_usd == pytest.approx(min(cost_of(problem, options) for options in everything), abs=1e-6)
    assert answer.cost_usd == pytest.approx(cost_of(problem, tuple(answer.options)))
    assert answer.bound_usd <= answer.cost_usd
    assert answer.cost_usd - answer.bound_usd <= 0.01 * len(problem.together) + 1e-4


@settings(max_examples=80, deadline=None, derandomize=True)
@given(problems())
def test_giving_what_the_relaxation_names_lets_the_rest_fit(problem: Choices) -> None:
    answer = choose(problem)
    if isinstance(answer, Chosen):
        return
    capacity = problem.capacity.copy()
    open_demands = {r.number for r in answer if r.kind == "demand"}
    for relaxation in answer:
        if relaxation.kind == "resource":
            capacity[relaxation.number] += relaxation.by
    lifted = {problem.locked[r.number] for r in answer if r.kind == "lock"}
    free = len(problem.demand)
    relaxed = Choices(
        demands=problem.demands,
        demand=np.concatenate([problem.demand, sorted(open_demands)]).astype(np.int64),
        cost_usd=np.concatenate([problem.cost_usd, np.zeros(len(open_demands))]),
        capacity=capacity,
        uses=problem.uses,
        needs=problem.needs,
        together=problem.together,
        locked=tuple(lock for lock in problem.locked if lock not in lifted)
        + tuple(range(free, free + len(open_demands))),
    )
    assert every_choice(relaxed)
    assert isinstance(choose(relaxed), Chosen)


def test_two_engines_that_want_one_module_are_named() -> None:
    problem = Choices(
        demands=2,
        demand=np.array([0, 1]),
        cost_usd=np.array([5.0, 7.0]),
        capacity=np.array([1]),
        uses=((0, 0, 1), (1, 0, 1)),
    )
    assert choose(problem) == (Relaxation("resource", 0, 1),)


def test_a_lock_gives_way_before_capacity_does() -> None:
    problem = Choices(
        demands=2,
        demand=np.array([0, 1, 1]),
        cost_usd=np.array([5.0, 7.0, 99.0]),
        capacity=np.array([1]),
        uses=((0, 0, 1), (1, 0, 1)),
        locked=(1,),
    )
    assert choose(problem) == (Relaxation("lock", 0, 1),)


def test_a_pair_that_costs_nothing_is_avoided_at_equal_cost() -> None:
    problem = Choices(
        demands=2,
        demand=np.array([0, 0, 1, 1]),
        cost_usd=np.array([5.0, 5.0, 5.0, 5.0]),
        together=(Together(((0,), (2,)), 0.0), Together(((1,), (3,)), 0.0), Together(((0,), (3,)), 0.0)),
    )
    answer = choose(problem)
    assert isinstance(answer, Chosen)
    assert answer.together == ()
    assert answer.options.tolist() == [1, 2]


def test_a_demand_without_options_is_named() -> None:
    answer = choose(Choices(demands=2, demand=np.array([0]), cost_usd=np.array([1.0])))
    assert answer == (Relaxation("demand", 1, 1),)


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"demand": np.array([0, 3])}, "demand numbers"),
        ({"together": (Together(((0,), (1,)), -1.0),)}, "costs less than 0"),
        ({"locked": (9,)}, "lock on option 9"),
        ({"uses": ((0, 4, 1),)}, "not there"),
    ],
)
def test_impossible_numbers_are_refused(change: dict, message: str) -> None:
    with pytest.raises(RequestError, match=message):
        choose(Choices(**{"demands": 2, "demand": np.array([0, 1]), "cost_usd": np.array([1.0, 2.0])} | change))
