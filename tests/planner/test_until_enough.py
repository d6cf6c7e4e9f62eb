"""A study stops when it knows enough, at the same run wherever it is computed, and says why."""

from __future__ import annotations

from pathlib import Path

import odd_jobs
import pytest

from planner.execute import Where
from planner.kept import Kept
from planner.rows import pack
from planner.sequential import looks
from planner.until_enough import Outcome, Stop, run_until_enough
from sim.errors import RequestError

HERE = Where(kind="here")
TWO = Where(kind="pool", workers=2)
STRATEGIES = ("whole_engine", "exchange", "cheapest")


def _study(stop: Stop, where: Where = HERE, **more: object) -> Outcome:
    payload = {"name": "study", "seconds": more.pop("seconds", 0.0)}
    return run_until_enough(odd_jobs.steady, payload, STRATEGIES, stop=stop, where=where, **more)


def _bytes(outcome: Outcome) -> dict[str, list[bytes]]:
    return {strategy: [pack(row) for row in rows] for strategy, rows in outcome.rows.items()}


def test_a_loose_precision_stops_at_a_planned_look_and_drops_the_surplus() -> None:
    seen: list[int] = []
    outcome = _study(Stop(precision_frac=0.3), look_at=lambda runs, verdict: seen.append(runs))
    assert outcome.verdict.reason == "precise"
    assert outcome.runs in looks()
    assert seen == [runs for runs in looks() if runs <= outcome.runs]
    assert {len(rows) for rows in outcome.rows.values()} == {outcome.runs}
    widest = max(pair.half_width for pair in outcome.verdict.pairs.values())
    mean = sum(row.total_usd for rows in outcome.rows.values() for row in rows) / (3 * outcome.runs)
    assert widest <= 0.3 * mean


def test_progress_goes_towards_the_run_at_which_it_will_stop() -> None:
    told: list[tuple[int, int, float]] = []
    outcome = _study(Stop(precision_frac=0.3), progress=lambda *far: told.append(far))
    assert told[0][1] == 3 * 1024
    assert told[-1][1] <= 3 * 2 * outcome.runs
    assert all(done <= total for done, total, _ in told)


def test_the_same_answer_comes_from_two_workers() -> None:
    one, two = _study(Stop(precision_frac=0.3)), _study(Stop(precision_frac=0.3), TWO)
    assert _bytes(one) == _bytes(two)
    assert one.verdict == two.verdict


def test_the_same_answer_comes_after_a_resume(tmp_path: Path) -> None:
    keys = {strategy: strategy for strategy in STRATEGIES}
    with Kept(tmp_path, keys, odd_jobs.OddRow) as kept:
        broken = _study(Stop(runs=60), TWO, seconds=0.01, kept=kept, cancelled=lambda: kept.count() >= 30)
    assert 0 < broken.runs < 60
    assert broken.verdict.reason == "cancelled"
    with Kept(tmp_path, keys, odd_jobs.OddRow) as kept:
        assert kept.count() >= 3 * broken.runs
        resumed = _study(Stop(runs=60), TWO, kept=kept)
    assert _bytes(resumed) == _bytes(_study(Stop(runs=60)))
    assert resumed.verdict.reason == "fixed"


def test_a_fixed_number_of_runs_has_the_plain_interval() -> None:
    outcome = _study(Stop(runs=5))
    assert outcome.runs == 5
    assert {pair.level_frac for pair in outcome.verdict.pairs.values()} == {0.95}


def test_it_ends_at_the_most_runs() -> None:
    outcome = _study(Stop(precision_frac=1e-9, most=20))
    assert (outcome.runs, outcome.verdict.reason) == (20, "most")


def test_a_study_cancelled_at_once_has_no_run_and_no_bounds() -> None:
    outcome = _study(Stop(runs=5), cancelled=lambda: True)
    assert outcome.runs == 0
    assert outcome.verdict.reason == "cancelled"


def test_runs_of_zero_and_senseless_precisions_are_refused() -> None:
    with pytest.raises(RequestError, match="--runs: found 0, expected 1 or more"):
        Stop(runs=0)
    for precision in (0.0, -0.1, 1.0, float("nan")):
        with pytest.raises(RequestError, match=r"--precision: found .*, expected a share of total cost"):
            Stop(precision_frac=precision)
