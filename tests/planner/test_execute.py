"""The same rows in the same order wherever jobs run, whatever is killed, and when the user stops."""

from __future__ import annotations

import os
import signal
import time
from concurrent.futures import Future
from pathlib import Path

import odd_jobs
import pytest

from planner import execute_pool
from planner.errors import LostWorkersError
from planner.execute import Where, execute, where_from
from planner.identity import identity
from planner.kept import Kept
from planner.rows import pack
from sim.errors import RequestError

HERE = Where(kind="here")
TWO = Where(kind="pool", workers=2)
TASKS = [(strategy, run) for run in range(30) for strategy in ("whole_engine", "exchange")]


def _bytes(results: object) -> list[tuple[object, bytes]]:
    return [(task, pack(row)) for task, row in results]


def _expected(payload: dict, tasks: list = TASKS) -> list[tuple[object, bytes]]:
    return [(task, pack(odd_jobs.steady({"name": payload["name"]}, *task))) for task in tasks]


@pytest.mark.parametrize("where", [HERE, Where(kind="pool", workers=1), TWO], ids=lambda where: f"{where.kind}")
def test_rows_come_in_the_order_of_the_tasks_and_are_the_same_anywhere(where: Where) -> None:
    payload = {"name": "a"}
    assert _bytes(execute(odd_jobs.steady, payload, TASKS, where=where)) == _expected(payload)


def test_unlike_durations_do_not_change_the_order() -> None:
    payload = {"name": "b", "seconds": 0.004}
    tasks = TASKS[::-1]
    assert _bytes(execute(odd_jobs.steady, payload, tasks, where=TWO)) == _expected(payload, tasks)


def test_both_workers_work_and_neither_loads_pandas() -> None:
    rows = [row for _, row in execute(odd_jobs.tells_its_process, {"seconds": 0.02}, TASKS, where=TWO)]
    assert len({row.total_usd for row in rows}) == 2
    assert os.getpid() not in {row.total_usd for row in rows}
    assert {row.removals for row in rows} == {0}


def test_a_worker_killed_in_mid_run_changes_no_digit(tmp_path: Path) -> None:
    payload = {"name": "c", "kill_at": 11, "marker": str(tmp_path / "killed"), "seconds": 0.002}
    said: list[str] = []
    rows = _bytes(execute(odd_jobs.kills_its_worker_once, payload, TASKS, where=TWO, notice=said.append))
    assert rows == _expected(payload)
    assert (tmp_path / "killed").exists()
    assert any("a worker was lost" in text for text in said)


def test_a_job_that_always_kills_its_worker_is_named_and_the_rest_is_kept(tmp_path: Path) -> None:
    payload = {"name": "d", "kill_at": 20}
    with (
        Kept(tmp_path, {"whole_engine": "w", "exchange": "x"}, odd_jobs.OddRow) as kept,
        pytest.raises(LostWorkersError, match=r"died 3 times without finishing a run.*20"),
    ):
        list(execute(odd_jobs.kills_its_worker_always, payload, TASKS, where=TWO, kept=kept))
    assert kept.count() >= 30


@pytest.mark.parametrize("where", [HERE, TWO], ids=lambda where: where.kind)
def test_an_error_of_a_job_is_raised_when_its_turn_comes(where: Where) -> None:
    results = execute(odd_jobs.fails_at_a_run, {"name": "e", "fail_at": 7}, TASKS, where=where)
    assert [next(results)[0] for _ in range(14)] == TASKS[:14]
    with pytest.raises(RequestError, match="run: found 7, expected another run"):
        next(results)


@pytest.mark.parametrize("where", [HERE, TWO], ids=lambda where: where.kind)
def test_cancelling_answers_within_a_second_and_leaves_a_prefix_without_gaps(where: Where) -> None:
    start = time.monotonic()
    tasks = [("a", run) for run in range(100_000)]
    payload = {"name": "f", "seconds": 0.02}
    rows = _bytes(
        execute(odd_jobs.steady, payload, tasks, where=where, cancelled=lambda: time.monotonic() > start + 1.0)
    )
    assert time.monotonic() - start < 2.0
    assert 10 < len(rows) < 200
    assert rows == _expected(payload, tasks[: len(rows)])


def test_a_reader_that_stops_early_drops_the_surplus_and_leaves_the_pool_usable() -> None:
    tasks = [("a", run) for run in range(100_000)]
    payload = {"name": "g", "seconds": 0.01}
    results = execute(odd_jobs.steady, payload, tasks, where=TWO)
    first = [next(results) for _ in range(16)]
    results.close()
    assert _bytes(first) == _expected(payload, tasks[:16])
    start = time.monotonic()
    assert len(list(execute(odd_jobs.steady, {"name": "h"}, TASKS, where=TWO))) == len(TASKS)
    assert time.monotonic() - start < 3.0


def test_what_a_stopped_study_left_in_the_pool_does_not_hold_up_the_next() -> None:
    """Chunks of a quarter of a second lie in the queue of the pool, which cannot take them back."""
    tasks = [("a", run) for run in range(100_000)]
    waits = []
    for number in range(3):
        results = execute(odd_jobs.steady, {"name": f"slider {number}", "seconds": 0.02}, tasks, where=TWO)
        for _ in range(40):
            next(results)
        results.close()
        start = time.monotonic()
        next(execute(odd_jobs.steady, {"name": "next"}, TASKS, where=TWO))
        waits.append(time.monotonic() - start)
    assert min(waits) < 0.2


def test_rows_that_are_all_at_hand_need_no_pool(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    keys = {"whole_engine": "w", "exchange": "x"}
    with Kept(tmp_path, keys, odd_jobs.OddRow) as kept:
        list(execute(odd_jobs.steady, {"name": "m"}, TASKS, where=HERE, kept=kept))
        monkeypatch.setattr("planner.execute._opened", None)
        assert _bytes(execute(odd_jobs.steady, {"name": "m"}, TASKS, where=TWO, kept=kept)) == _expected({"name": "m"})


def test_ctrl_c_in_the_midst_of_handing_over_a_chunk_comes_after_it(monkeypatch: pytest.MonkeyPatch) -> None:
    """Interrupted there, loky would keep work that nobody does and wait for it at the end of the program."""
    reached = []

    class Executor:
        def submit(self, *_: object) -> Future:
            signal.raise_signal(signal.SIGINT)
            reached.append("the end of submit")
            return Future()

    monkeypatch.setattr(execute_pool.loky, "get_reusable_executor", lambda **_: Executor())
    pool = execute_pool.Pool(2, lambda text: None)
    handler = signal.getsignal(signal.SIGINT)
    with pytest.raises(KeyboardInterrupt):
        pool.submit(identity(), b"")
    pool.close()
    assert reached == ["the end of submit"]
    assert signal.getsignal(signal.SIGINT) is handler


def test_progress_rises_to_the_total_and_foretells_the_time_left() -> None:
    told: list[tuple[int, int, float]] = []
    payload = {"name": "i", "seconds": 0.01}
    list(execute(odd_jobs.steady, payload, TASKS, where=TWO, progress=lambda *far: told.append(far)))
    done = [far[0] for far in told]
    assert done == sorted(done)
    assert told[-1] == (60, 60, 0.0)
    assert all(0.0 <= left < 5.0 for _, _, left in told if done and left == left)


def test_a_process_that_is_stopped_for_a_while_only_delays_the_study() -> None:
    """A machine that sleeps stops all processes at once; here one worker is stopped while the others go on."""
    payload = {"name": "j", "seconds": 0.01}
    results = execute(odd_jobs.tells_its_process, {"seconds": 0.01}, TASKS, where=TWO)
    worker = int(next(results)[1].total_usd)
    results.close()
    results = execute(odd_jobs.steady, payload, TASKS, where=TWO)
    rows = [next(results)]
    os.kill(worker, signal.SIGSTOP)
    time.sleep(0.5)
    os.kill(worker, signal.SIGCONT)
    rows += results
    assert _bytes(rows) == _expected(payload)


def test_rows_at_hand_are_not_computed_again(tmp_path: Path) -> None:
    payload = {"name": "k"}
    keys = {"whole_engine": "w", "exchange": "x"}
    with Kept(tmp_path, keys, odd_jobs.OddRow) as kept:
        list(execute(odd_jobs.steady, payload, TASKS[:31], where=TWO, kept=kept))
    told: list[int] = []
    with Kept(tmp_path, keys, odd_jobs.OddRow) as kept:
        assert kept.count() == 31
        other = {**payload, "fail_at": 3}

        def hear(done: int, total: int, seconds_left: float) -> None:
            told.append(done)

        again = execute(odd_jobs.fails_at_a_run, other, TASKS, where=HERE, kept=kept, progress=hear)
        assert _bytes(again) == _expected(payload)
    assert told[0] == 32


def test_options_name_the_place() -> None:
    assert where_from(1, None) == HERE
    assert where_from(2, None) == TWO
    assert where_from(None, None) == Where(kind="pool")
    assert where_from(3, "local") == Where(kind="cluster", address="local", workers=3)
    with pytest.raises(RequestError, match="--workers: found 0, expected 1 or more"):
        where_from(0, None)
