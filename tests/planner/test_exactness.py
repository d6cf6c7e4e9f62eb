"""One study of the real simulation, computed in every way there is: byte-identical rows."""

from __future__ import annotations

import signal
from pathlib import Path

import pytest
from line_fleet import line_fleet
from loopback import LoopbackCluster

from planner.execute import Where
from planner.rows import pack
from planner.study import CompareRequest, Study, run_study
from sim.fleet import Fleet

RUNS = 8
REQUEST = CompareRequest(runs=RUNS, seed=7)


@pytest.fixture(scope="module")
def fleet() -> Fleet:
    return line_fleet(aircraft=10, spares=2, shelf=("LPT", "fan"), horizon_years=10.0)


@pytest.fixture(scope="module")
def undisturbed(fleet: Fleet) -> dict[str, list[bytes]]:
    return _bytes(run_study(fleet, REQUEST, where=Where(kind="here")))


def _bytes(study: Study) -> dict[str, list[bytes]]:
    return {strategy: [pack(row) for row in rows] for strategy, rows in study.rows.items()}


def test_the_runs_differ_among_each_other(undisturbed: dict[str, list[bytes]]) -> None:
    """Else the tests below would compare nothing."""
    assert {len(set(rows)) for rows in undisturbed.values()} == {RUNS}
    assert len({tuple(rows) for rows in undisturbed.values()}) == len(undisturbed) == 2


@pytest.mark.parametrize("workers", [1, 2, 3])
def test_any_number_of_workers(fleet: Fleet, undisturbed: dict[str, list[bytes]], workers: int) -> None:
    assert _bytes(run_study(fleet, REQUEST, where=Where(kind="pool", workers=workers))) == undisturbed


def test_a_cluster_over_tcp_that_loses_a_worker(
    fleet: Fleet, undisturbed: dict[str, list[bytes]], tmp_path: Path
) -> None:
    pytest.importorskip("distributed")
    cluster = LoopbackCluster(tmp_path)
    try:
        workers = [cluster.worker(), cluster.worker()]
        killed = []

        def kill_one(done: int, total: int, seconds_left: float) -> None:
            if done >= 4 and not killed:
                workers[0].send_signal(signal.SIGKILL)
                killed.append(done)

        where = Where(kind="cluster", address=cluster.address)
        found = _bytes(run_study(fleet, REQUEST, where=where, progress=kill_one))
        assert killed
        assert found == undisturbed
    finally:
        cluster.close()


def test_a_study_that_was_cancelled_and_resumed(
    fleet: Fleet, undisturbed: dict[str, list[bytes]], tmp_path: Path
) -> None:
    seen = []
    broken = run_study(
        fleet,
        REQUEST,
        where=Where(kind="here"),
        home=tmp_path,
        progress=lambda done, total, left: seen.append(done),
        cancelled=lambda: len(seen) >= 7,
    )
    assert 0 < broken.runs < RUNS
    resumed = run_study(fleet, REQUEST, where=Where(kind="pool", workers=2), home=tmp_path)
    assert resumed.kept_runs == 7
    assert _bytes(resumed) == undisturbed


def test_another_seed_is_another_study(fleet: Fleet, undisturbed: dict[str, list[bytes]], tmp_path: Path) -> None:
    run_study(fleet, REQUEST, where=Where(kind="here"), home=tmp_path)
    other = run_study(fleet, CompareRequest(runs=RUNS, seed=8), where=Where(kind="here"), home=tmp_path)
    assert other.kept_runs == 0
    assert _bytes(other) != undisturbed
