"""One study: every strategy under the same luck, run after run, until the difference is known well enough.

Runs are handed out far ahead so that no worker waits; the stopping rule looks at them in run order, at the planned
numbers of runs, and what was computed beyond the stop is dropped. So the answer does not depend on where or by how many
workers it was computed.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from contextlib import closing
from dataclasses import dataclass
from typing import Any, Literal, NamedTuple

import numpy as np
from numpy.typing import NDArray

from planner.chunk import Job, Task
from planner.execute import Where, execute
from planner.execute_tally import Listener
from planner.kept import Kept
from planner.sequential import LEAST_RUNS, MOST_RUNS, Verdict, expected_runs, judge, looks, plain_verdict
from sim.errors import RequestError


@dataclass(frozen=True, slots=True, kw_only=True)
class Stop:
    """When to stop: after ``runs`` runs, or (None) by the rule with ``precision_frac`` of total cost."""

    runs: int | None = None
    precision_frac: float = 0.01
    least: int = LEAST_RUNS
    most: int = MOST_RUNS

    def __post_init__(self) -> None:
        if self.runs is not None and self.runs < 1:
            raise RequestError("--runs", str(self.runs), "1 or more", "leave it out to let the stopping rule decide")
        if not 0.0 < self.precision_frac < 1.0:
            raise RequestError("--precision", str(self.precision_frac), "a share of total cost between 0 and 1")


class Outcome(NamedTuple):
    """The rows of each strategy in run order, all of the same number, and why there are that many."""

    rows: dict[str, list[Any]]
    verdict: Verdict
    runs: int


def run_until_enough(
    job: Job,
    payload: Any,
    strategies: Sequence[str],
    *,
    stop: Stop,
    where: Where,
    total: Callable[[Any], float] = lambda row: row.total_usd,
    kept: Kept[Any] | None = None,
    progress: Listener | None = None,
    cancelled: Callable[[], bool] = lambda: False,
    notice: Callable[[str], None] = lambda text: None,
    look_at: Callable[[int, Verdict], None] = lambda runs, verdict: None,
) -> Outcome:
    """Run ``job(payload, strategy, run)`` for run 0, 1, 2 … of every strategy until the rule says stop.

    ``look_at`` hears the verdict of each look. A cancelled study returns its whole runs up to there, none at the least.
    """
    most = stop.runs or stop.most
    planned = () if stop.runs else looks(least=min(stop.least, most), most=most)
    tasks: list[Task] = [(strategy, run) for run in range(most) for strategy in strategies]
    rows: dict[str, list[Any]] = {strategy: [] for strategy in strategies}
    horizon = _Horizon(len(strategies) * most, progress)
    results = execute(
        job,
        payload,
        tasks,
        where=where,
        kept=kept,
        progress=horizon if progress else None,
        cancelled=cancelled,
        notice=notice,
    )
    with closing(results):  # type: ignore[type-var]  # an iterator here is a generator
        for (strategy, run), row in results:
            rows[strategy].append(row)
            if strategy == strategies[-1] and run + 1 in planned:
                so_far = _totals(rows, total)
                verdict = judge(so_far, precision_frac=stop.precision_frac, planned=planned)
                horizon.rows = len(strategies) * expected_runs(
                    so_far, precision_frac=stop.precision_frac, planned=planned
                )
                look_at(run + 1, verdict)
                if verdict.stop:
                    return Outcome(rows, verdict, run + 1)
    whole = min(len(found) for found in rows.values())
    rows = {strategy: found[:whole] for strategy, found in rows.items()}
    reason: Literal["fixed", "cancelled"] = "fixed" if whole == stop.runs else "cancelled"
    return Outcome(rows, plain_verdict(_totals(rows, total), reason=reason), whole)


class _Horizon:
    """Progress as a user wants it: towards the run at which the rule is likely to stop, not the most allowed."""

    def __init__(self, rows: int, progress: Listener | None) -> None:
        self.rows, self._progress = rows, progress

    def __call__(self, done: int, total: int, seconds_left: float) -> None:
        """Pass on how far it is; the pace is the same, the end is nearer."""
        if self._progress is not None:
            end = max(self.rows, done)
            left = seconds_left * (end - done) / (total - done) if total > done else 0.0
            self._progress(done, end, left)


def _totals(rows: dict[str, list[Any]], total: Callable[[Any], float]) -> dict[str, NDArray[np.float64]]:
    return {strategy: np.array([total(row) for row in found]) for strategy, found in rows.items()}
