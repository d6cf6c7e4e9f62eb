"""Which of several parts to replace at which visit, when every visit costs something of its own.

A part installed at step ``s`` with a life of ``T_i`` steps may stay until step ``s + T_i``; a new set is on at step 0.
With ``x[i, t]`` = 1 when part ``i`` is replaced at step ``t`` (1 … T) and ``z[t]`` = 1 when the engine is open then:

    minimise    sum_t ( sum_i c[i, t] x[i, t] + d[t] z[t] )
    subject to  sum_{t = l+1 … l+T_i} x[i, t] >= 1    for every i and l = 0 … T - T_i
                x[i, t] <= z[t],    x and z binary

Source: Almgren, Andréasson, Patriksson, Strömberg, Wojciechowski, Önnheim, "The opportunistic replacement problem",
Mathematical Methods of Operations Research 76 (2012). For given visits each part's windows are intervals of time, a
totally unimodular matrix, hence only ``z`` must be declared whole: ``x`` then is whole at every vertex.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from planner.minimise import Rows, minimise
from sim.errors import NoSolutionError, RequestError

_WHOLE = 1e-6  # a binary that HiGHS returns may be off by its feasibility tolerance, 1e-6 by default


@dataclass(frozen=True, slots=True, kw_only=True)
class SharedVisits:
    """The problem: lives in steps, shape (parts,); part costs, shape (parts, steps); visit costs, shape (steps,)."""

    lives_steps: NDArray[np.int64]
    part_usd: NDArray[np.float64]
    visit_usd: NDArray[np.float64]


class Replacements(NamedTuple):
    """The answer: what is replaced when, its cost, and how far the best possible cost may lie below it."""

    cost_usd: float
    bound_usd: float
    relaxed_usd: float
    replaced: NDArray[np.bool_]
    visits: NDArray[np.bool_]

    @property
    def gap_frac(self) -> float:
        """Return how much of the cost a better answer could still save."""
        return max(0.0, self.cost_usd - self.bound_usd) / self.cost_usd if self.cost_usd > 0 else 0.0


def replace_at_shared_visits(problem: SharedVisits, *, limit_s: float = 60.0) -> Replacements:
    """Return a schedule of least cost, with the bound that the solver proved and that of the linear relaxation.

    Raises RequestError when lives or costs cannot be, NoSolutionError when the time ran out before any schedule.
    """
    _check(problem)
    parts, steps = problem.part_usd.shape
    cost = np.concatenate([problem.part_usd.ravel(), problem.visit_usd])
    rows = _rows(problem)
    worth = _steps_worth_a_visit(problem)
    most = np.concatenate([np.tile(worth, parts), worth]).astype(np.float64)
    whole = np.repeat([False, True], [parts * steps, steps])
    relaxed = minimise(cost, rows)
    found = minimise(cost, rows, whole=whole, high=most, limit_s=limit_s)
    if found.x is None:
        raise NoSolutionError("replacement at shared visits", f"nothing found in {limit_s:g} s")
    visits: NDArray[np.bool_] = found.x[parts * steps :] > 0.5
    replaced = _replacements_at(problem, visits, wanted=found.x[: parts * steps].reshape(parts, steps))
    total = schedule_usd(problem, replaced)
    return Replacements(total, min(found.bound, total), relaxed.cost, replaced, visits_of(replaced))


def visits_of(replaced: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """Return the steps at which anything is replaced."""
    at_all: NDArray[np.bool_] = np.logical_or.reduce(replaced, axis=0)
    return at_all


def schedule_usd(problem: SharedVisits, replaced: NDArray[np.bool_]) -> float:
    """Return what a schedule costs: every replacement, and each visit once."""
    return float((problem.part_usd * replaced).sum() + problem.visit_usd[visits_of(replaced)].sum())


def first_overrun(problem: SharedVisits, replaced: NDArray[np.bool_]) -> tuple[int, int] | None:
    """Return (part, step) at which a part first stays beyond its life, or None when the schedule holds every limit."""
    steps = problem.visit_usd.size
    for part, life in enumerate(problem.lives_steps):
        last = 0
        for step in range(1, steps + 1):
            # Removal at the very step at which the life ends is in time.
            if step - last > life or (step - last == life and not replaced[part, step - 1]):
                return part, step
            if replaced[part, step - 1]:
                last = step
    return None


def _check(problem: SharedVisits) -> None:
    if problem.part_usd.shape != (problem.lives_steps.size, problem.visit_usd.size):
        raise RequestError(
            "shared visits",
            f"costs of shape {problem.part_usd.shape}",
            f"(parts, steps) = ({problem.lives_steps.size}, {problem.visit_usd.size})",
        )
    if (problem.lives_steps < 1).any():
        raise RequestError("shared visits", f"a life of {problem.lives_steps.min()} steps", "lives from 1 step")
    if (problem.part_usd < 0).any() or (problem.visit_usd < 0).any():
        raise RequestError("shared visits", "a cost below zero", "costs of zero or more")


def _steps_worth_a_visit(problem: SharedVisits) -> NDArray[np.bool_]:
    """Return the steps that a best schedule may be built from.

    When waiting never costs more, every visit can be put off until some life ends at it; that life began at an earlier
    visit that was put off likewise, so only sums of lives remain. With costs that rise in time all steps are kept.
    """
    steps = problem.visit_usd.size
    if (np.diff(problem.part_usd, axis=1) > 0).any() or (np.diff(problem.visit_usd) > 0).any():
        return np.ones(steps, dtype=np.bool_)
    ends = np.zeros(steps + 1, dtype=np.bool_)
    ends[0] = True
    for step in range(1, steps + 1):
        ends[step] = any(life <= step and ends[step - life] for life in problem.lives_steps)
    return ends[1:]


def _rows(problem: SharedVisits) -> Rows:
    """Return the constraints: every window of a part's life holds a replacement, and replacing needs a visit."""
    parts, steps = problem.part_usd.shape
    rows = Rows()
    for part, life in enumerate(problem.lives_steps.tolist()):
        for start in range(max(0, steps - life + 1)):
            rows.add(range(part * steps + start, part * steps + start + life), 1.0, low=1.0)
    for part in range(parts):
        for step in range(steps):
            rows.add((parts * steps + step, part * steps + step), (1.0, -1.0), low=0.0)
    return rows


def _replacements_at(
    problem: SharedVisits, visits: NDArray[np.bool_], *, wanted: NDArray[np.float64]
) -> NDArray[np.bool_]:
    """Return whole replacements for fixed visits, cheapest part by part.

    The solver's ``x`` is whole at a vertex; where it is not (a tie), a shortest path over the visits settles the part.
    """
    replaced = wanted > 0.5
    doubtful = np.abs(wanted - np.round(wanted)).max(axis=1) > _WHOLE
    for part in np.flatnonzero(doubtful):
        replaced[part] = _cheapest_path(problem, int(part), visits)
    return np.asarray(replaced & visits, dtype=np.bool_)


def _cheapest_path(problem: SharedVisits, part: int, visits: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """Return the cheapest replacements of one part at the given visits, by shortest path over its installations."""
    steps, life = problem.visit_usd.size, int(problem.lives_steps[part])
    least = np.full(steps + 1, np.inf)  # least[s]: cost so far when the part goes on at step s
    least[0] = 0.0
    before = np.zeros(steps + 1, dtype=np.int64)
    for step in (np.flatnonzero(visits) + 1).tolist():
        earliest = max(0, step - life)
        best = earliest + int(np.argmin(least[earliest:step]))
        least[step], before[step] = least[best] + problem.part_usd[part, step - 1], best
    first_that_lasts = max(0, steps - life + 1)
    last = first_that_lasts + int(np.argmin(least[first_that_lasts:]))
    replaced = np.zeros(steps, dtype=np.bool_)
    while last > 0:
        replaced[last - 1] = True
        last = int(before[last])
    return replaced
