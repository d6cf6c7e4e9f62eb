"""One engine's openings as values: what may be done at which point, what it costs, and what a plan of it costs."""

from __future__ import annotations

from dataclasses import dataclass
from itertools import pairwise
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]


class Install(NamedTuple):
    """One way to install a part: at which point, until which point it may stay, its price less what is left at the end.

    ``stock`` numbers a used part that exists once, -1 is a new part.
    """

    part: int
    at: int
    until: int
    usd: float
    stock: int = -1


@dataclass(frozen=True, slots=True, kw_only=True)
class Openings:
    """The problem on ``points`` points (0 … points - 1, the last is the end); all money is present value.

    Shapes: ``visit_usd`` (steps,) with steps = points - 1; ``open_usd`` (modules, steps); ``run_usd`` and
    ``run_loss_degC`` (modules, steps, points) by point of restoration and point of the run's end or of the reading;
    ``first_run_usd`` and ``first_loss_degC`` (modules, points) for the run that is under way; ``budget_degC``
    (points,); ``in_front`` (modules, modules) true where the second comes off before the first; ``keep_until`` and
    ``keep_usd`` (parts,) for the parts that are in. The three ``must`` fields hold for point 0.
    """

    visit_usd: Floats
    open_usd: Floats
    run_usd: Floats
    first_run_usd: Floats
    run_loss_degC: Floats
    first_loss_degC: Floats
    budget_degC: Floats
    in_front: NDArray[np.bool_]
    part_module: NDArray[np.int64]
    keep_until: NDArray[np.int64]
    keep_usd: Floats
    installs: tuple[Install, ...]
    must_visit: bool = False
    must_open: tuple[int, ...] = ()
    must_restore: tuple[int, ...] = ()


def plan_usd(problem: Openings, *, restored: NDArray[np.bool_], installs: tuple[Install, ...]) -> float:
    """Return what a plan costs on any grounds, solver or rule: openings follow from what is restored and installed.

    A part that is never replaced keeps its value at the end; ``restored`` has shape (modules, steps).
    """
    modules, steps = restored.shape
    opened = opened_for(problem, restored=restored, installs=installs)
    visited: NDArray[np.bool_] = np.logical_or.reduce(opened, axis=0)
    visited[0] |= problem.must_visit
    total = float(problem.visit_usd[visited].sum() + problem.open_usd[opened].sum())
    for module in range(modules):
        times = [-1, *np.flatnonzero(restored[module]).tolist(), steps]
        for start, end in pairwise(times):
            total += float(problem.first_run_usd[module, end] if start < 0 else problem.run_usd[module, start, end])
    replaced = {one.part for one in installs if one.until >= steps}
    kept = [part for part, until in enumerate(problem.keep_until.tolist()) if until >= steps and part not in replaced]
    return total + sum(one.usd for one in installs) + float(problem.keep_usd[kept].sum())


def opened_for(problem: Openings, *, restored: NDArray[np.bool_], installs: tuple[Install, ...]) -> NDArray[np.bool_]:
    """Return the modules (modules, steps) that must be open for the work: each with all that stands in front of it."""
    opened = restored.copy()
    for one in installs:
        opened[problem.part_module[one.part], one.at] = True
    for module in problem.must_open:
        opened[module, 0] = True
    for module in range(opened.shape[0]):
        for front in np.flatnonzero(problem.in_front[module]):
            opened[front] |= opened[module]
    return opened
