"""The real command, as a process: stopped by Ctrl-C or killed, resumed, saved on a full disk, computed again."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
import time
from pathlib import Path
from typing import Any

import pytest

RUNS = 40


@pytest.fixture(scope="module")
def fleet(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A small demo fleet."""
    folder = tmp_path_factory.mktemp("demo") / "fleet"
    _spoolwright(folder.parent, "demo", str(folder), "--aircraft", "6")
    return folder


def _command(*arguments: str) -> list[str]:
    return [sys.executable, "-m", "planner.cli", *arguments]


def _spoolwright(home: Path, *arguments: str, code: int = 0) -> str:
    """Run a command to its end and return what it printed."""
    done = subprocess.run(
        _command(*arguments), env=_environment(home), capture_output=True, text=True, timeout=120, check=False
    )
    assert done.returncode == code, done.stderr
    return done.stdout


def _environment(home: Path) -> dict[str, str]:
    return {**os.environ, "SPOOLWRIGHT_HOME": str(home)}


def _compare(fleet: Path, *more: str, runs: int = RUNS, workers: int = 2) -> list[str]:
    options = ("--runs", str(runs), "--horizon", "3", "--workers", str(workers))
    return ["compare", str(fleet), *options, "--json", *more]


def _figures(text: str) -> dict[str, Any]:
    """Return what a study says of the fleet, without what it says of itself."""
    result = json.loads(text)["result"]
    return {name: result[name] for name in ("strategies", "differences", "costs", "sweep", "removals")}


def _interrupt(home: Path, fleet: Path, number: int) -> tuple[int, str, str]:
    """Start a comparison, send a signal once a few runs are kept, and return exit code and what was printed."""
    study = subprocess.Popen(
        _command(*_compare(fleet)),
        env=_environment(home),
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
        text=True,
        start_new_session=True,
    )
    while _bytes_kept(home) < 60_000:  # a quarter of them, so that the first runs are whole on a busy machine too
        assert study.poll() is None, study.stderr.read()
        time.sleep(0.01)
    (study.kill if number == signal.SIGKILL else lambda: os.killpg(study.pid, number))()
    out, err = study.communicate(timeout=30)
    return study.returncode, out, err


def _bytes_kept(home: Path) -> int:
    return sum(path.stat().st_size for path in home.glob("kept/*/*.rows"))


@pytest.fixture(scope="module")
def undisturbed(fleet: Path, tmp_path_factory: pytest.TempPathFactory) -> dict[str, Any]:
    return _figures(_spoolwright(tmp_path_factory.mktemp("home"), *_compare(fleet)))


def test_ctrl_c_answers_with_the_runs_that_are_whole_and_resume_goes_on_to_the_same_figures(
    fleet: Path, undisturbed: dict[str, Any], tmp_path: Path
) -> None:
    _, out, err = _interrupt(tmp_path, fleet, signal.SIGINT)
    assert "Traceback" not in err
    broken = json.loads(out)
    assert 0 < broken["result"]["runs"] < RUNS
    assert broken["result"]["stopped"] == "cancelled"
    assert _figures(_spoolwright(tmp_path, *_compare(fleet, "--resume"))) == undisturbed


def test_a_killed_comparison_resumes_to_the_same_figures(
    fleet: Path, undisturbed: dict[str, Any], tmp_path: Path
) -> None:
    code, out, _ = _interrupt(tmp_path, fleet, signal.SIGKILL)
    assert (code, out) == (-signal.SIGKILL, "")
    assert list((tmp_path / "kept").glob("*/*.rows"))
    assert not (tmp_path / "studies").exists()
    assert _figures(_spoolwright(tmp_path, *_compare(fleet, "--resume"))) == undisturbed


def test_a_home_that_cannot_be_written_costs_the_copy_and_not_the_answer(fleet: Path, tmp_path: Path) -> None:
    home = tmp_path / "home"
    home.write_text("a file where the folder should be")
    text = _spoolwright(home, *_compare(fleet, runs=2, workers=1))
    assert json.loads(text)["result"]["runs"] == 2
    assert any("not saved" in warning for warning in json.loads(text)["warnings"])


def test_a_saved_comparison_comes_again_to_the_last_digit(fleet: Path, tmp_path: Path) -> None:
    _spoolwright(tmp_path, *_compare(fleet, runs=3, workers=1))
    (line,) = json.loads(_spoolwright(tmp_path, "runs", "list", "--json"))["result"]["studies"]
    shown = json.loads(_spoolwright(tmp_path, "runs", "show", line["study"], "--again", "--json"))
    again = shown["result"]["again"]
    assert (again["same"], again["rows"], again["first_difference"]) == (True, 9, "")


def test_no_save_leaves_nothing(fleet: Path, tmp_path: Path) -> None:
    _spoolwright(tmp_path, *_compare(fleet, "--no-save", runs=1, workers=1))
    assert list(tmp_path.iterdir()) == []
