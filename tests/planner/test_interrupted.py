"""A study that is stopped from outside, as a process of its own: what was finished is kept, the rest is done again."""

from __future__ import annotations

import os
import random
import signal
import subprocess
import sys
import time
from pathlib import Path

import odd_jobs
import psutil
import pytest

from planner.kept import Kept
from planner.rows import pack

STUDY = Path(__file__).parent / "jobs" / "odd_study.py"
RUNS = 80


def _start(home: Path, *, seconds: float = 0.02, workers: int = 2) -> subprocess.Popen:
    """Start a study in a process group of its own, as a shell on a terminal does."""
    command = [sys.executable, str(STUDY), str(home), str(RUNS), str(seconds), str(workers)]
    return subprocess.Popen(command, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, start_new_session=True)


def _read_runs(study: subprocess.Popen, count: int) -> list[str]:
    lines = []
    while len(lines) < count:
        line = study.stdout.readline()
        assert line, study.stderr.read()
        if line.startswith("run"):
            lines.append(line.strip())
    return lines


def _undisturbed() -> list[str]:
    rows = [odd_jobs.steady({"name": "process"}, "exchange", run) for run in range(RUNS)]
    return [f"run {run} {row.total_usd!r}" for run, row in enumerate(rows)]


def _resumed(home: Path) -> tuple[int, list[str]]:
    """Run the same study again; return how many rows it found and the lines that it gave."""
    study = _start(home, seconds=0.0)
    out, err = study.communicate(timeout=60)
    assert study.returncode == 0, err
    lines = out.splitlines()
    return int(lines[0].removeprefix("found ")), lines[1:-1]


def _workers_of(study: subprocess.Popen) -> list[psutil.Process]:
    return psutil.Process(study.pid).children(recursive=True)


@pytest.mark.parametrize("name", ["SIGINT", "SIGHUP", "SIGTERM", "SIGKILL"])
def test_a_stopped_study_keeps_what_it_showed_leaves_no_process_and_resumes_to_the_same_figures(
    tmp_path: Path, name: str
) -> None:
    """SIGINT is Ctrl-C (sent to the whole group, as a terminal does), SIGHUP a terminal that is closed."""
    study = _start(tmp_path)
    shown = _read_runs(study, 15)
    workers = _workers_of(study)
    assert len(workers) >= 2
    if name == "SIGKILL":
        study.kill()
    else:
        os.killpg(study.pid, getattr(signal, name))
    out, _ = study.communicate(timeout=10)
    shown += out.split("\n")[:-1]
    _, alive = psutil.wait_procs(workers, timeout=5)
    assert alive == []
    found, lines = _resumed(tmp_path)
    last = int(shown[-1].split()[1])
    assert found > last >= 14
    assert lines == _undisturbed()
    assert set(shown) <= set(lines)


def test_ctrl_c_is_answered_within_a_second(tmp_path: Path) -> None:
    study = _start(tmp_path)
    _read_runs(study, 5)
    start = time.monotonic()
    os.killpg(study.pid, signal.SIGINT)
    study.communicate(timeout=10)
    assert time.monotonic() - start < 1.5
    assert study.returncode != 0


def test_a_machine_that_sleeps_in_mid_study_only_delays_it(tmp_path: Path) -> None:
    study = _start(tmp_path)
    _read_runs(study, 5)
    everyone = [psutil.Process(study.pid), *_workers_of(study)]
    for process in everyone:
        process.suspend()
    time.sleep(1.0)
    for process in everyone:
        process.resume()
    out, err = study.communicate(timeout=60)
    assert study.returncode == 0, err
    assert out.splitlines()[-1] == "done"


def test_a_disk_that_fills_up_in_mid_study_costs_the_journal_and_not_the_answer(tmp_path: Path) -> None:
    """The limit on file sizes stands in for the disk: writes beyond it fail half-way, as on a full disk."""
    limited = (
        "import resource, signal, sys; signal.signal(signal.SIGXFSZ, signal.SIG_IGN);"
        "resource.setrlimit(resource.RLIMIT_FSIZE, (4000, 4000)); import runpy;"
        "sys.argv = sys.argv[1:]; sys.path.insert(0, sys.argv.pop(0)); runpy.run_path(sys.argv[0], run_name='__main__')"
    )
    command = [sys.executable, "-c", limited, str(STUDY.parent), str(STUDY), str(tmp_path), str(RUNS), "0.0", "1"]
    done = subprocess.run(command, capture_output=True, text=True, timeout=60, check=False)
    assert done.returncode == 0, done.stderr
    assert done.stdout.splitlines()[1:-1] == _undisturbed()
    found, lines = _resumed(tmp_path)
    assert 1 < found < RUNS
    assert lines == _undisturbed()


def _killed_at_random_moments(home: Path, kills: int, luck: random.Random) -> None:
    """Kill a study again and again in mid-run; whatever it showed must be found by the next one, byte for byte."""
    shown: set[str] = set()
    for _ in range(kills):
        study = _start(home, seconds=0.005, workers=1)
        try:
            out, _ = study.communicate(timeout=0.3 + luck.random() * 0.5)
        except subprocess.TimeoutExpired:
            study.kill()
            out, _ = study.communicate()
        shown |= {line for line in out.split("\n")[:-1] if line.startswith("run")}
        with Kept(home, {"exchange": "key"}, odd_jobs.OddRow) as kept:
            for line in shown:
                run = int(line.split()[1])
                assert pack(kept.get(("exchange", run))) == pack(odd_jobs.steady({"name": "process"}, "exchange", run))
    assert shown
    assert shown <= set(_undisturbed())
    assert _resumed(home)[1] == _undisturbed()


def test_killed_three_times_at_random_moments_nothing_shown_is_lost(tmp_path: Path) -> None:
    _killed_at_random_moments(tmp_path, 3, random.Random(1))


@pytest.mark.long
def test_killed_a_hundred_times_at_random_moments_nothing_shown_is_lost(tmp_path: Path) -> None:
    luck = random.Random(2)
    for part in range(20):
        _killed_at_random_moments(tmp_path / str(part), 5, luck)
