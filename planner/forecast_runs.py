"""The months ahead as the simulation has them: removals, and time without an engine of one's own. A job for
workers."""

from __future__ import annotations

from collections.abc import Callable
from contextlib import closing
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from planner.execute import Where, execute
from planner.execute_tally import Listener
from planner.job import Scenario, run_log
from planner.shortage import covered_share, lacks, removals_by_stretch
from sim.fleet import Fleet

Floats = NDArray[np.float64]


class MonthsRow(NamedTuple):
    """One run: removals and share of days on which a position has no engine of its own, shape (types, months)
    each."""

    removals: Floats
    without_own: Floats


class Simulated(NamedTuple):
    """Means over runs, shape (types, months) each, and how many runs there were."""

    removals: Floats
    without_own: Floats
    runs: int


def months_job(payload: tuple[Scenario, Floats], strategy: str, run: int) -> MonthsRow:
    """Simulate one run and count by month; what workers import."""
    scenario, edges = payload
    log = run_log(scenario, strategy, run)
    kinds = [t.engine_type for t in scenario.fleet.engine_types]
    removals = removals_by_stretch(scenario.fleet, log, edges)
    found = lacks(scenario.fleet, log, end=float(edges[-1]))
    return MonthsRow(
        np.array([removals[kind] for kind in kinds]),
        np.array([covered_share(found.without_own[kind], edges) for kind in kinds]),
    )


def simulated(
    fleet: Fleet,
    strategy: str,
    edges: Floats,
    *,
    runs: int,
    seed: int,
    where: Where,
    progress: Listener | None = None,
    cancelled: Callable[[], bool] = lambda: False,
) -> Simulated:
    """Return the months of so many runs of a strategy; fewer when cancelled."""
    scenario = Scenario(fleet=fleet, horizon_days=float(edges[-1]), seed=seed)
    rows: list[MonthsRow] = []
    results = execute(
        months_job,
        (scenario, edges),
        [(strategy, run) for run in range(runs)],
        where=where,
        progress=progress,
        cancelled=cancelled,
    )
    with closing(results):  # type: ignore[type-var]  # an iterator here is a generator
        for _, row in results:
            rows.append(row)
    shape = (len(fleet.engine_types), edges.size - 1)
    if not rows:
        return Simulated(np.full(shape, np.nan), np.full(shape, np.nan), 0)
    return Simulated(
        np.mean([row.removals for row in rows], axis=0), np.mean([row.without_own for row in rows], axis=0), len(rows)
    )
