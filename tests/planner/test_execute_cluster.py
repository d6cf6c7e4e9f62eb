"""A cluster of real processes on loopback: the same rows, whatever is lost; unlike workers are refused by name."""

from __future__ import annotations

import shutil
import signal
from collections.abc import Iterator
from pathlib import Path

import odd_jobs
import pytest
from loopback import LoopbackCluster

from planner.errors import LostWorkersError
from planner.execute import Where, execute
from planner.kept import Kept
from planner.rows import pack
from sim.errors import RequestError

execute_cluster = pytest.importorskip("planner.execute_cluster", exc_type=ImportError)

ROOT = Path(__file__).resolve().parents[2]
TASKS = [("whole_engine", run) for run in range(60)]
KEYS = {"whole_engine": "w"}


@pytest.fixture
def cluster(tmp_path: Path) -> Iterator[LoopbackCluster]:
    made = LoopbackCluster(tmp_path)
    try:
        yield made
    finally:
        made.close()


def _expected(name: str) -> list[tuple[object, bytes]]:
    return [(task, pack(odd_jobs.steady({"name": name}, *task))) for task in TASKS]


def _bytes(results: object) -> list[tuple[object, bytes]]:
    return [(task, pack(row)) for task, row in results]


def test_a_lost_worker_changes_no_digit(cluster: LoopbackCluster) -> None:
    cluster.worker()
    second = cluster.worker()
    where = Where(kind="cluster", address=cluster.address)
    results = execute(odd_jobs.steady, {"name": "a", "seconds": 0.05}, TASKS, where=where)
    rows = [next(results) for _ in range(10)]
    second.send_signal(signal.SIGKILL)
    rows += results
    assert _bytes(rows) == _expected("a")


def test_when_all_workers_are_lost_the_study_waits_for_new_ones(cluster: LoopbackCluster) -> None:
    first = cluster.worker()
    where = Where(kind="cluster", address=cluster.address)
    said: list[str] = []
    results = execute(odd_jobs.steady, {"name": "b", "seconds": 0.05}, TASKS, where=where, notice=said.append)
    rows = [next(results) for _ in range(5)]
    first.send_signal(signal.SIGKILL)
    cluster.worker()
    rows += results
    assert _bytes(rows) == _expected("b")
    assert any("is gone" in text for text in said)


def test_when_the_scheduler_is_lost_what_came_back_is_kept(cluster: LoopbackCluster, tmp_path: Path) -> None:
    cluster.worker()
    where = Where(kind="cluster", address=cluster.address)
    with Kept(tmp_path, KEYS, odd_jobs.OddRow) as kept:
        results = execute(odd_jobs.steady, {"name": "c", "seconds": 0.02}, TASKS, where=where, kept=kept)
        for _ in range(10):
            next(results)
        cluster.scheduler.send_signal(signal.SIGKILL)
        with pytest.raises(LostWorkersError, match=r"scheduler at tcp://.* is gone; \d+ of 60 runs were finished"):
            list(results)
    with Kept(tmp_path, KEYS, odd_jobs.OddRow) as kept:
        assert kept.count() >= 10
        again = execute(odd_jobs.steady, {"name": "c"}, TASKS, where=Where(kind="here"), kept=kept)
        assert _bytes(again) == _expected("c")


def test_a_worker_with_other_sources_is_refused_by_name_and_the_others_go_on(
    cluster: LoopbackCluster, tmp_path: Path
) -> None:
    other = tmp_path / "other"
    for layer in ("sim", "planner"):
        shutil.copytree(ROOT / layer, other / layer, ignore=shutil.ignore_patterns("__pycache__"))
    (other / "sim" / "errors.py").write_text((other / "sim" / "errors.py").read_text() + "\n# changed\n")
    cluster.worker(sources=other)
    where = Where(kind="cluster", address=cluster.address)
    refusal = r"worker tcp://127.0.0.1:\d+: its sources \(.*\) are not those of the study"
    with pytest.raises(RequestError, match=refusal):
        list(execute(odd_jobs.steady, {"name": "d"}, TASKS, where=where))
    cluster.worker()
    said: list[str] = []
    assert _bytes(execute(odd_jobs.steady, {"name": "d"}, TASKS, where=where, notice=said.append)) == _expected("d")
    assert any("is refused: its sources" in text for text in said)


def test_a_cluster_of_this_machine_is_started_and_ended_by_the_word_local() -> None:
    where = Where(kind="cluster", address="local", workers=2)
    assert _bytes(execute(odd_jobs.steady, {"name": "e"}, TASKS, where=where)) == _expected("e")


def test_no_scheduler_at_the_address_is_a_clear_error(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(execute_cluster, "CONNECT_SECONDS", 1)
    where = Where(kind="cluster", address="tcp://127.0.0.1:9")
    with pytest.raises(RequestError, match=r"--cluster: found no scheduler at tcp://127.0.0.1:9"):
        list(execute(odd_jobs.steady, {"name": "f"}, TASKS, where=where))
