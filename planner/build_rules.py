"""Simple rules for what to do at an opening, played forward on the same points and prices as the best plan.

``run out``       replace what has no life left, restore what the margin needs, nothing more
``exposed only``  the same, and in what is open anyway replace every part that would not reach the goal
``hard goal``     open whatever holds a part or a margin that would not reach the goal

Each waits until a limit or the margin forces the next opening. A rule's cost is counted by the same function as the
best plan's, so the difference is the money that the rule loses.
"""

from __future__ import annotations

from typing import Literal, NamedTuple

import numpy as np
from numpy.typing import NDArray

from planner.openings import Install, Openings, plan_usd
from sim.errors import NoSolutionError

Rule = Literal["run_out", "exposed_only", "hard_goal"]


class Played(NamedTuple):
    """What a rule does: modules restored (modules, steps), installations, cost."""

    restored: NDArray[np.bool_]
    installs: tuple[Install, ...]
    cost_usd: float


def play(problem: Openings, rule: Rule, *, goal_steps: int = 1) -> Played:
    """Return the plan that a rule makes; ``goal_steps`` is the build goal in points, unused by ``run_out``.

    Raises NoSolutionError where not even everything done at a point reaches the next one.
    """
    modules, steps = problem.open_usd.shape
    restored = np.zeros((modules, steps), dtype=np.bool_)
    until = problem.keep_until.copy()
    installs: list[Install] = []
    goal = 1 if rule == "run_out" else max(1, goal_steps)
    point = 0 if problem.must_visit else next_opening(problem, 0, until, restored)
    while point < steps:
        reach = min(point + goal, steps)
        if point == 0:
            restored[list(problem.must_restore), 0] = True
        forced = until < min(point + 1, steps)
        if rule == "hard_goal":
            forced = until < reach
        _restore_for_margin(problem, point, restored, reach if rule == "hard_goal" else min(point + 1, steps))
        if rule == "exposed_only":
            exposed = _open_at(problem, point, restored, forced)
            forced |= exposed[problem.part_module] & (until < reach)
        for part in np.flatnonzero(forced).tolist():
            best = _longest_new(problem, part, point)
            installs.append(best)
            until[part] = best.until
        after = next_opening(problem, point, until, restored)
        if after <= point:
            raise NoSolutionError(f"rule {rule}", f"nothing that can be done at point {point} reaches the next one")
        point = after
    plan = tuple(installs)
    return Played(restored, plan, plan_usd(problem, restored=restored, installs=plan))


def best_goal(problem: Openings, rule: Rule, *, goals_steps: tuple[int, ...]) -> tuple[int, Played]:
    """Return the build goal with which a rule costs least, and what it then does; ties go to the shorter goal."""
    played = [(goal, play(problem, rule, goal_steps=goal)) for goal in goals_steps]
    return min(played, key=lambda one: (one[1].cost_usd, one[0]))


def next_opening(problem: Openings, point: int, until: NDArray[np.int64], restored: NDArray[np.bool_]) -> int:
    """Return the last point that every part and the margin reach from here, the end at the latest."""
    steps = problem.visit_usd.size
    last = int(min(until.min(initial=steps), steps))
    for after in range(point + 1, last + 1):
        if _lost_degC(problem, after, restored).sum() > problem.budget_degC[after] + 1e-9:
            return after - 1
    return last


def _lost_degC(problem: Openings, point: int, restored: NDArray[np.bool_]) -> NDArray[np.float64]:
    """Return each module's loss at a point, from its last restoration before that point."""
    lost = problem.first_loss_degC[:, point].copy()
    for module in range(lost.size):
        times = np.flatnonzero(restored[module, :point])
        if times.size:
            lost[module] = problem.run_loss_degC[module, times[-1], point]
    return lost


def _restore_for_margin(problem: Openings, point: int, restored: NDArray[np.bool_], reach: int) -> None:
    """Restore modules, the most margin for the money first, until the margin lasts to ``reach`` or all are done."""
    while not restored[:, point].all():
        lost = _lost_degC(problem, reach, restored)
        if lost.sum() <= problem.budget_degC[reach] + 1e-9:
            return
        gain = lost - problem.run_loss_degC[:, point, reach]
        gain[restored[:, point]] = -np.inf
        if gain.max() <= 0:
            return
        price = problem.run_usd[:, point, reach] + problem.open_usd[:, point]
        worth = np.where(gain > 0, gain / np.maximum(price, 1.0), -np.inf)
        restored[int(np.argmax(worth)), point] = True


def _open_at(
    problem: Openings, point: int, restored: NDArray[np.bool_], forced: NDArray[np.bool_]
) -> NDArray[np.bool_]:
    """Return the modules that are open at a point for the forced work, fronts included."""
    opened = restored[:, point].copy()
    opened[problem.part_module[forced]] = True
    if point == 0:
        opened[list(problem.must_open)] = True
    for module in np.flatnonzero(opened):
        opened |= problem.in_front[module]
    return opened


def _longest_new(problem: Openings, part: int, point: int) -> Install:
    """Return the new part that lasts longest among those that can be installed here."""
    new = [one for one in problem.installs if one.part == part and one.at == point and one.stock < 0]
    if not new:
        raise NoSolutionError("simple rule", f"part {part} has no new part to install at point {point}")
    return max(new, key=lambda one: one.until)
