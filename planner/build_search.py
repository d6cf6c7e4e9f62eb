"""Which points a build plan is solved on: few enough to prove the best, refined until nothing moves.

An opening is best put off until something runs out, so good points are those at which the simple rules open the engine,
the present limits, and the margin's run-out. The kernel is solved exactly on about ten of them, each opening found is
then put off as far as the work before it allows, and what that brings becomes points of the next round. Every round
keeps the openings of the best plan so far, so the cost never rises.
"""

from __future__ import annotations

import time
from itertools import pairwise
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from planner.build_kernel import Opened, open_at_best
from planner.build_points import BuildProblem, openings_of, points_of
from planner.build_rules import best_goal, next_opening, play
from planner.openings import Install, Openings, opened_for, plan_usd
from sim.errors import NoSolutionError

FINE = 40  # even steps of the fine points, on which rules are played and openings put off
MOST = 10  # points, the end not counted, on which the kernel is solved
ROUNDS = 3
_GOALS = 14  # build goals tried for each rule
_SHARE = 0.6  # of the time left that a round may take


class Searched(NamedTuple):
    """The plan of the last round with its points and arrays, and the fine points with their arrays."""

    points: tuple[float, ...]
    openings: Openings
    best: Opened
    fine_points: tuple[float, ...]
    fine: Openings


class _Plan(NamedTuple):
    """A plan on the fine points."""

    restored: NDArray[np.bool_]
    installs: tuple[Install, ...]
    cost_usd: float


def search(problem: BuildProblem, *, limit_s: float) -> Searched:
    """Return the best plan found within the time, proven on its points unless its bound says otherwise.

    Raises NoSolutionError when not even everything done at every point keeps limits and margin.
    """
    began = time.monotonic()
    fine_points = points_of(problem, step_cycles=max(1.0, problem.end_cycles / FINE))
    fine = openings_of(problem, points=fine_points)
    seeds = _rule_plans(fine)
    chosen = _spread(fine_points, _first_points(problem, fine_points), [_visits(fine, plan) for plan in seeds])
    found: tuple[tuple[int, ...], Openings, Opened] | None = None
    known = seeds[0] if seeds else None
    for round_number in range(ROUNDS):
        left = limit_s - (time.monotonic() - began)
        if round_number and left < 0.15 * limit_s:
            break
        openings = openings_of(problem, points=tuple(fine_points[index] for index in chosen))
        had = _on_chosen(openings, chosen, known) if known is not None else None
        best = open_at_best(openings, limit_s=max(0.5, _SHARE * left), known=had)
        if found is None or best.cost_usd < found[2].cost_usd + 1.0:
            found = (chosen, openings, best)
        plan = _on_fine(fine, chosen, best)
        later = _put_off(fine, plan)
        better = [one for one in (later, known, plan) if one is not None]
        known = min(better, key=lambda one: one.cost_usd)
        wanted = [_visits(fine, one) for one in (known, plan)]
        following = _spread(fine_points, {0}, [*wanted, _first_points(problem, fine_points)])
        if following == chosen:
            break
        chosen = following
    assert found is not None
    points = tuple(fine_points[index] for index in found[0])
    return Searched(points, found[1], found[2], fine_points, fine)


def goals_of(problem: Openings) -> tuple[int, ...]:
    """Return the build goals, in points, that rules are tuned over."""
    steps = problem.visit_usd.size
    return tuple(range(1, steps + 1, max(1, steps // _GOALS)))


def _rule_plans(fine: Openings) -> list[_Plan]:
    plans = []
    for rule in ("hard_goal", "exposed_only"):
        try:
            _, played = best_goal(fine, rule, goals_steps=goals_of(fine))
        except NoSolutionError:
            continue
        plans.append(_Plan(played.restored, played.installs, played.cost_usd))
    try:
        run_out = play(fine, "run_out")
        plans.append(_Plan(run_out.restored, run_out.installs, run_out.cost_usd))
    except NoSolutionError:
        pass
    return sorted(plans, key=lambda plan: plan.cost_usd)


def _first_points(problem: BuildProblem, fine_points: tuple[float, ...]) -> set[int]:
    """Return today and the two soonest limits, as numbers of fine points."""
    soonest = sorted({float(p.left_cycles) for p in problem.parts if 0 < p.left_cycles < problem.end_cycles})[:2]
    return {0, *(fine_points.index(at) for at in soonest if at in fine_points)}


def _spread(fine_points: tuple[float, ...], first: set[int], wanted: list[set[int]]) -> tuple[int, ...]:
    """Return at most MOST points and the end: the first ones, then each wanted set while there is room, then an even
    filling of the widest gaps."""
    end = len(fine_points) - 1
    chosen = {0, end, *first}
    for some in wanted:
        for index in sorted(some):
            if len(chosen) <= MOST:
                chosen.add(index)
    while len(chosen) <= MOST:
        order = sorted(chosen)
        gaps = [(fine_points[b] - fine_points[a], a, b) for a, b in pairwise(order) if b - a > 1]
        if not gaps:
            break
        _, low, high = max(gaps, key=lambda gap: (gap[0], -gap[1]))
        middle = (fine_points[low] + fine_points[high]) / 2.0
        chosen.add(min(range(low + 1, high), key=lambda index: abs(fine_points[index] - middle)))
    return tuple(sorted(chosen))


def _visits(problem: Openings, plan: _Plan) -> set[int]:
    opened = opened_for(problem, restored=plan.restored, installs=plan.installs)
    return {int(point) for point in np.flatnonzero(np.logical_or.reduce(opened, axis=0))}


def _on_fine(fine: Openings, chosen: tuple[int, ...], best: Opened) -> _Plan:
    """Return a plan of the chosen points as a plan of the fine ones."""
    restored = np.zeros(fine.open_usd.shape, dtype=np.bool_)
    for place, index in enumerate(chosen[:-1]):
        restored[:, index] = best.restored[:, place]
    installs = tuple(_install(fine, one.part, chosen[one.at], one.stock) for one in best.installs)
    return _Plan(restored, installs, plan_usd(fine, restored=restored, installs=installs))


def _on_chosen(openings: Openings, chosen: tuple[int, ...], plan: _Plan) -> Opened | None:
    """Return a plan of the fine points on the chosen ones, None when one of its openings is not among them."""
    place = {index: number for number, index in enumerate(chosen[:-1])}
    at = np.flatnonzero(np.logical_or.reduce(plan.restored, axis=0)).tolist()
    if any(index not in place for index in (*at, *(one.at for one in plan.installs))):
        return None
    restored = np.zeros(openings.open_usd.shape, dtype=np.bool_)
    for index in at:
        restored[:, place[index]] = plan.restored[:, index]
    installs = tuple(_install(openings, one.part, place[one.at], one.stock) for one in plan.installs)
    opened = opened_for(openings, restored=restored, installs=installs)
    cost = plan_usd(openings, restored=restored, installs=installs)
    return Opened(opened, restored, installs, cost, -np.inf)


def _install(fine: Openings, part: int, at: int, stock: int) -> Install:
    return next(one for one in fine.installs if (one.part, one.at, one.stock) == (part, at, stock))


def _put_off(fine: Openings, plan: _Plan) -> _Plan | None:
    """Return the plan with every opening put off as far as what was done before allows, if that is no dearer."""
    steps = fine.visit_usd.size
    until, restored = fine.keep_until.copy(), np.zeros_like(plan.restored)
    installs: list[Install] = []
    point = 0
    for visit in sorted(_visits(fine, plan)):
        at = visit if visit == 0 and fine.must_visit else next_opening(fine, point, until, restored)
        if at >= steps:
            break
        at = max(at, visit)
        if at > visit and at > next_opening(fine, point, until, restored):
            return None
        restored[:, at] |= plan.restored[:, visit]
        for one in plan.installs:
            if one.at != visit:
                continue
            moved = [i for i in fine.installs if (i.part, i.at, i.stock) == (one.part, at, one.stock)]
            if not moved:
                return None
            installs.append(moved[0])
            until[one.part] = moved[0].until
        point = at
    if next_opening(fine, point, until, restored) < steps:
        return None
    return _Plan(restored, tuple(installs), plan_usd(fine, restored=restored, installs=tuple(installs)))
