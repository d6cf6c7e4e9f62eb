"""What the margin demands of restorations, said once more as covers: the same plans, a much better bound.

For a point t and a set C of modules, let s be the last point from which on C must be touched: if no module of C is
restored in [s, t), then even with every other module at its best the losses at t are beyond the budget. So

    sum over m in C and q in [s, t) of restored[m, q] >= 1

for every minimal C (a cover inequality of the knapsack that each point's margin row is; Balas, *Mathematical
Programming* 8, 1975). What stands in front of all of C is open then, hence the same holds for its openings or, where
nothing does, for the visits.
"""

from __future__ import annotations

from itertools import combinations
from typing import NamedTuple

import numpy as np

from planner.openings import Floats, Openings


class Cover(NamedTuple):
    """Modules of which one must be restored at a point from ``since`` on, before ``point``."""

    modules: tuple[int, ...]
    since: int
    point: int


def covers(problem: Openings) -> tuple[Cover, ...]:
    """Return the minimal covers of every point, each with the shortest window that it holds for."""
    steps = problem.visit_usd.size
    worn = np.flatnonzero(
        (problem.first_loss_degC.max(axis=1) > 0.0) | (problem.run_loss_degC.max(axis=(1, 2)) > 0.0)
    ).tolist()
    found: list[Cover] = []
    for point in range(1, steps + 1):
        if not np.isfinite(problem.budget_degC[point]):
            continue
        least = _least_lost(problem, point)
        here: list[Cover] = []
        for size in range(1, len(worn) + 1):
            for chosen in combinations(worn, size):
                since = _last_window(least, chosen, float(problem.budget_degC[point]), point)
                if since is None or any(set(one.modules) <= set(chosen) and one.since >= since for one in here):
                    continue
                here.append(Cover(chosen, since, point))
        found += here
    return tuple(found)


def gates(problem: Openings, cover: Cover) -> tuple[int, ...]:
    """Return the modules that are open whenever any module of a cover is restored."""
    opened = [set(np.flatnonzero(problem.in_front[m]).tolist()) | {m} for m in cover.modules]
    return tuple(sorted(set.intersection(*opened)))


def _least_lost(problem: Openings, point: int) -> Floats:
    """Return, for s = 0 … point, the least loss of each module at a point if it is not restored in [s, point)."""
    least = np.empty((point + 1, problem.open_usd.shape[0]))
    least[0] = problem.first_loss_degC[:, point]
    for start in range(point):
        least[start + 1] = np.minimum(least[start], problem.run_loss_degC[:, start, point])
    return least


def _last_window(least: Floats, chosen: tuple[int, ...], budget: float, point: int) -> int | None:
    """Return the last s for which leaving the chosen modules alone in [s, point) breaks the budget; None: none does."""
    rest = float(least[point].sum() - least[point, list(chosen)].sum())
    for since in range(point - 1, -1, -1):
        if rest + float(least[since, list(chosen)].sum()) > budget + 1e-9:
            return since
    return None
