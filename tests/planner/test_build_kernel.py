"""The kernel of one engine's openings equals brute force on everything small enough to enumerate."""

import dataclasses
import itertools

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.build_kernel import open_at_best
from planner.openings import Install, Openings, plan_usd
from sim.errors import NoSolutionError, RequestError


def cheapest_of_all(problem: Openings) -> float:
    """Return the least cost over every set of openings, restorations and installations; inf when nothing fits."""
    modules, steps = problem.open_usd.shape
    best = np.inf
    subsets = [s for n in range(steps + 1) for s in itertools.combinations(range(steps), n)]
    for restored in itertools.product(subsets, repeat=modules):
        runs = [list(itertools.pairwise((-1, *times, steps))) for times in restored]
        if any(0 not in restored[m] for m in problem.must_restore):
            continue
        late = False
        for point in range(1, steps + 1):
            lost = 0.0
            for m in range(modules):
                start = max((t for t in restored[m] if t < point), default=-1)
                lost += problem.first_loss_degC[m, point] if start < 0 else problem.run_loss_degC[m, start, point]
            late = late or lost > problem.budget_degC[point] + 1e-9
        if late:
            continue
        money = sum(
            problem.first_run_usd[m, e] if s < 0 else problem.run_usd[m, s, e]
            for m in range(modules)
            for s, e in runs[m]
        )
        for chosen in itertools.chain.from_iterable(
            itertools.combinations(problem.installs, n) for n in range(len(problem.installs) + 1)
        ):
            for kept in itertools.product((False, True), repeat=len(problem.keep_usd)):
                best = min(best, money + parts_and_openings(problem, chosen, kept, restored))
    return best


def parts_and_openings(problem, chosen, kept, restored) -> float:
    modules, steps = problem.open_usd.shape
    stocks = [one.stock for one in chosen if one.stock >= 0]
    if len(stocks) != len(set(stocks)):
        return np.inf
    for part in range(len(kept)):
        spans = [(one.at, one.until) for one in chosen if one.part == part]
        spans += [(0, int(problem.keep_until[part]))] if kept[part] else []
        if any(not any(a <= step < b for a, b in spans) for step in range(steps)):
            return np.inf
        if sum(b >= steps for _, b in spans) > 1:
            return np.inf
    wanted = {(int(problem.part_module[one.part]), one.at) for one in chosen}
    wanted |= {(m, t) for m in range(modules) for t in restored[m]}
    wanted |= {(m, 0) for m in problem.must_open}
    for m, t in list(wanted):
        wanted |= {(f, t) for f in range(modules) if problem.in_front[m, f]}
    visits = {t for _, t in wanted} | ({0} if problem.must_visit else set())
    return (
        sum(problem.visit_usd[t] for t in visits)
        + sum(problem.open_usd[m, t] for m, t in wanted)
        + sum(one.usd for one in chosen)
        + sum(problem.keep_usd[p] for p, k in enumerate(kept) if k and problem.keep_until[p] >= steps)
    )


@st.composite
def problems(draw: st.DrawFn) -> Openings:
    modules, parts, steps = 2, draw(st.integers(1, 2)), draw(st.integers(2, 3))
    part_module = [draw(st.integers(0, 1)) for _ in range(parts)]
    installs = []
    for part in range(parts):
        life = draw(st.integers(1, 3))
        installs += [Install(part, at, min(steps, at + life), draw(st.integers(1, 9))) for at in range(steps)]
    if draw(st.booleans()):
        used_at = draw(st.integers(0, steps - 1))
        installs += [Install(p, used_at, min(steps, used_at + 2), 1.0, stock=0) for p in range(parts)]

    def money(*shape: int) -> np.ndarray:
        flat = draw(st.lists(st.integers(0, 9), min_size=int(np.prod(shape)), max_size=int(np.prod(shape))))
        return np.array(flat, dtype=float).reshape(shape)

    wear = np.array([draw(st.integers(0, 4)) for _ in range(modules)], dtype=float)
    ages = np.arange(steps + 1)[None, None, :] - np.arange(steps)[None, :, None]
    return Openings(
        visit_usd=money(steps),
        open_usd=money(modules, steps),
        run_usd=money(modules, steps, steps + 1),
        first_run_usd=money(modules, steps + 1),
        run_loss_degC=wear[:, None, None] * np.maximum(ages, 0),
        first_loss_degC=wear[:, None] * (np.arange(steps + 1) + draw(st.integers(0, 2))),
        budget_degC=np.full(steps + 1, float(draw(st.integers(4, 20)))),
        in_front=np.array([[False, draw(st.booleans())], [False, False]]),
        part_module=np.array(part_module),
        keep_until=np.array([draw(st.integers(0, steps)) for _ in range(parts)]),
        keep_usd=-money(parts) * 0.3,
        installs=tuple(installs),
        must_visit=draw(st.booleans()),
        must_open=draw(st.sampled_from([(), (0,), (1,)])),
        must_restore=draw(st.sampled_from([(), (), (0,)])),
    )


@settings(max_examples=25, deadline=None, derandomize=True)
@given(problems())
def test_the_cheapest_plan_equals_brute_force(problem: Openings) -> None:
    wanted = cheapest_of_all(problem)
    if not np.isfinite(wanted):
        with pytest.raises(NoSolutionError, match="build plan"):
            open_at_best(problem)
        return
    answer = open_at_best(problem)
    assert answer.cost_usd == pytest.approx(wanted, abs=1e-6)
    assert answer.bound_usd == pytest.approx(wanted, abs=1e-3)
    assert plan_usd(problem, restored=answer.restored, installs=answer.installs) <= answer.cost_usd + 1e-6


def one_module(**change: object) -> Openings:
    plain = Openings(
        visit_usd=np.array([10.0, 10.0]),
        open_usd=np.array([[1.0, 1.0]]),
        run_usd=np.full((1, 2, 3), 5.0),
        first_run_usd=np.zeros((1, 3)),
        run_loss_degC=np.zeros((1, 2, 3)),
        first_loss_degC=np.array([[0.0, 1.0, 9.0]]),
        budget_degC=np.full(3, 10.0),
        in_front=np.zeros((1, 1), dtype=bool),
        part_module=np.array([0]),
        keep_until=np.array([2]),
        keep_usd=np.array([0.0]),
        installs=(Install(0, 0, 2, 3.0), Install(0, 1, 2, 3.0)),
    )
    return dataclasses.replace(plain, **change)


def test_nothing_is_done_when_nothing_runs_out() -> None:
    assert open_at_best(one_module()).cost_usd == 0


def test_a_module_is_restored_before_the_margin_runs_out() -> None:
    answer = open_at_best(one_module(budget_degC=np.full(3, 8.0)))
    assert answer.cost_usd == 10 + 1 + 5
    assert answer.restored.sum() == 1


def test_a_used_part_cannot_be_bought_twice() -> None:
    twice = (Install(0, 0, 1, 1.0, stock=0), Install(0, 1, 2, 1.0, stock=0))
    with pytest.raises(NoSolutionError, match="cannot be kept together"):
        open_at_best(one_module(installs=twice, keep_until=np.array([0])))


def test_what_cannot_be_kept_is_named() -> None:
    with pytest.raises(NoSolutionError, match="part 0 has no life and no replacement from point 1 on"):
        open_at_best(one_module(installs=(), keep_until=np.array([1])))
    with pytest.raises(NoSolutionError, match=r"still lose 4\.0 degC by point 1, more than the 3\.0 degC"):
        open_at_best(
            one_module(
                run_loss_degC=np.full((1, 2, 3), 4.0), first_loss_degC=np.full((1, 3), 4.0), budget_degC=np.full(3, 3.0)
            )
        )


def test_an_installation_outside_the_plan_is_refused() -> None:
    with pytest.raises(RequestError, match="from point 1 to 5"):
        open_at_best(one_module(installs=(Install(0, 1, 5, 1.0),)))
