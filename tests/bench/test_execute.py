"""What running elsewhere costs: overhead of pool and cluster, gain of a second worker, cancelling, a what-if, saving.

Run with `pytest -m bench -s tests/bench/test_execute.py`; ratios count, absolutes drift with the machine.
"""

from __future__ import annotations

import statistics
import time
from pathlib import Path

import odd_jobs
import odd_saver
import odd_work
import pytest

from planner import store
from planner.execute import Where, execute
from planner.kept import Kept

pytestmark = pytest.mark.bench

RUN_SECONDS = 0.025
RUNS = 160
REPEATS = 5


def _loops() -> int:
    """Return the rounds that cost about as much as one run of the reference fleet."""
    start = time.perf_counter()
    odd_work.busy({"loops": 200_000}, "a", 0)
    return int(200_000 * RUN_SECONDS / (time.perf_counter() - start))


def _seconds(where: Where, loops: int, runs: int = RUNS, kept: Kept | None = None) -> float:
    start = time.perf_counter()
    tasks = [("a", run) for run in range(runs)]
    count = sum(1 for _ in execute(odd_work.busy, {"loops": loops}, tasks, where=where, kept=kept))
    assert count == runs
    return time.perf_counter() - start


def _row(name: str, value: str, against: str = "") -> None:
    print(f"  {name:<52} {value:>10}  {against}")


def test_overhead_of_pool_and_cluster_and_the_gain_of_a_second_worker() -> None:
    pytest.importorskip("distributed")
    loops = _loops()
    places = {
        "here": Where(kind="here"),
        "pool of one": Where(kind="pool", workers=1),
        "pool of two": Where(kind="pool", workers=2),
    }
    found: dict[str, list[float]] = {name: [] for name in places}
    for where in places.values():
        _seconds(where, loops, runs=8)  # warm
    for _ in range(REPEATS):  # in turn, so that a busy moment of the machine hits all alike
        for name, where in places.items():
            found[name].append(_seconds(where, loops))
    here, one, two = (statistics.median(found[name]) for name in places)
    cluster = _seconds(Where(kind="cluster", address="local", workers=2), loops, runs=4 * RUNS)
    print(f"\n{RUNS} runs of {1000 * here / RUNS:.1f} ms")
    _row("this process", f"{here:.3f} s")
    _row("pool of one against this process", f"{one / here:.3f} x", "overhead of sending under 1.05")
    _row("pool of two against pool of one", f"{one / two:.2f} x", "at least 1.8, aim 1.95")
    _row("local cluster of two, from cold, four times the runs", f"{cluster:.2f} s", f"{4 * here / cluster:.2f} x here")


def _seconds_to_stop(where: Where, loops: int) -> float:
    """Return how long a study in full swing goes on after it was cancelled."""
    until = time.perf_counter() + 0.5
    tasks = [("a", run) for run in range(10_000)]
    payload = {"loops": loops}
    list(execute(odd_work.busy, payload, tasks, where=where, cancelled=lambda: time.perf_counter() > until))
    return time.perf_counter() - until


def test_a_what_if_on_a_warm_pool_and_cancelling() -> None:
    loops = _loops()
    two = Where(kind="pool", workers=2)
    cold = _seconds(two, loops, runs=2)
    first = statistics.median(_seconds(two, loops, runs=32) for _ in range(7))
    stops = [_seconds_to_stop(two, loops) for _ in range(7)]
    print()
    _row("first chunk (pool may be cold)", f"{cold:.2f} s")
    _row("16 runs of two strategies, warm pool of two", f"{first:.2f} s", "at least 0.6, aim 0.3")
    _row("cancel", f"{statistics.median(stops):.3f} s", "at least 0.5, aim 0.25")


def test_keeping_and_saving(tmp_path: Path) -> None:
    row = odd_work.busy({"loops": 1}, "a", 1)
    start = time.perf_counter()
    with Kept(tmp_path, {"a": "key"}, odd_jobs.OddRow) as kept:
        for run in range(1000):
            kept.put(("a", run), row)
    keeping = time.perf_counter() - start
    start = time.perf_counter()
    with Kept(tmp_path, {"a": "key"}, odd_jobs.OddRow) as kept:
        assert kept.count() == 1000
    finding = time.perf_counter() - start
    rows = {("a", run): row._replace(removals=run) for run in range(1000)}
    start = time.perf_counter()
    name = store.save(tmp_path, odd_saver.manifest(1), inputs={}, rows=rows)
    saving = time.perf_counter() - start
    start = time.perf_counter()
    assert len(store.load(tmp_path, name).rows(odd_jobs.OddRow)) == 1000
    loading = time.perf_counter() - start
    print("\n1,000 rows of 8 kB")
    _row("kept as they arrive, each", f"{keeping:.3f} ms", "beside a run of some 25 ms")
    _row("found again", f"{1000 * finding:.0f} ms")
    _row("study saved / loaded", f"{1000 * saving:.0f} ms", f"{1000 * loading:.0f} ms")
