"""The screen's long work in a process of its own: it outlives whoever asked, and whoever answers."""

from __future__ import annotations

import inspect
import os
import signal
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from pathlib import Path

import odd_jobs
import psutil
import pytest

from planner import runner, runner_process
from planner.errors import SavedRunsError
from planner.request_files import Status, read_status, runner_lives, write_json
from sim.errors import RequestError

PROGRAM = (str(Path(__file__).parent / "jobs" / "odd_runner.py"),)


class Desk:
    """The screen's side of one home."""

    def __init__(self, home: Path) -> None:
        self.home = home

    def submit(self, user: str = "ann", **asked: object) -> str:
        request = {"command": "odd", "name": "desk", "runs": 40, **asked}
        return runner.submit(request, user=user, home=self.home, program=PROGRAM)

    def status(self, name: str) -> Status:
        return runner.status(name, home=self.home, program=PROGRAM)

    def wait(self, name: str, is_true: Callable[[Status], bool], *, seconds: float = 20.0) -> Status:
        until = time.monotonic() + seconds
        while not is_true(found := self.status(name)):
            assert time.monotonic() < until, found
            time.sleep(0.05)
        return found

    def runners(self) -> list[psutil.Process]:
        return [
            process
            for process in psutil.process_iter(["cmdline"])
            if str(self.home) in (process.info["cmdline"] or []) and PROGRAM[0] in process.info["cmdline"]
        ]

    def figures(self, name: str) -> list[float]:
        return runner.answer(name, home=self.home)["figures"]


@pytest.fixture
def desk(tmp_path: Path) -> Iterator[Desk]:
    made = Desk(tmp_path / "höme")
    yield made
    for process in made.runners():
        process.kill()
    psutil.wait_procs(made.runners(), timeout=5)
    for process in runner._started:
        process.wait()


def _expected(runs: int, name: str = "desk") -> list[float]:
    return [odd_jobs.steady({"name": name}, "exchange", run).total_usd for run in range(runs)]


def test_a_request_is_answered_and_found_again_by_its_name(desk: Desk) -> None:
    name = desk.submit(seconds=0.01)
    done = desk.wait(name, lambda status: status.is_over)
    assert (done.state, done.study, done.error, done.note) == ("done", "0123456789abcdef", None, {"runs": 40})
    assert desk.figures(name) == _expected(40)
    assert [status.id for status in runner.jobs("ann", home=desk.home)] == [name]
    assert runner.jobs("bob", home=desk.home) == []


def test_cancelling_answers_within_a_second_and_keeps_what_is_done(desk: Desk) -> None:
    name = desk.submit(runs=10_000, seconds=0.02)
    seen = desk.wait(name, lambda status: status.done >= 20)
    assert seen.state == "running"
    assert seen.seconds_left > 10.0
    start = time.monotonic()
    runner.cancel(name, home=desk.home, program=PROGRAM)
    over = desk.wait(name, lambda status: status.is_over)
    assert time.monotonic() - start < 1.0
    assert over.state == "cancelled"
    figures = desk.figures(name)
    assert len(figures) >= 15
    assert figures == _expected(len(figures))


def test_two_users_share_the_pool_and_the_second_request_of_one_waits(desk: Desk) -> None:
    long = desk.submit("ann", name="long", runs=10_000, seconds=0.02)
    second = desk.submit("ann", name="second")
    desk.wait(long, lambda status: status.done > 0)
    short = desk.submit("bob", name="short", runs=20)
    assert desk.wait(short, lambda status: status.is_over, seconds=8.0).state == "done"
    assert desk.status(long).state == "running"
    assert desk.status(second).state == "waiting"
    assert desk.figures(short) == _expected(20, "short")
    runner.cancel(second, home=desk.home, program=PROGRAM)
    assert desk.wait(second, lambda status: status.is_over).state == "cancelled"
    assert len(desk.runners()) == 1
    runner.cancel(long, home=desk.home, program=PROGRAM)
    desk.wait(long, lambda status: status.is_over)


def test_a_killed_runner_is_replaced_and_goes_on_from_what_was_kept(desk: Desk) -> None:
    name = desk.submit(runs=150, seconds=0.02)
    desk.wait(name, lambda status: status.done >= 30)
    (killed,) = desk.runners()
    killed.kill()
    done = desk.wait(name, lambda status: status.is_over)
    assert (done.state, done.tries) == ("done", 2)
    assert desk.figures(name) == _expected(150)
    assert runner.answer(name, home=desk.home)["found"] >= 30


def test_a_request_that_kills_its_runner_is_given_up_and_the_next_is_served(desk: Desk) -> None:
    deadly = desk.submit("ann", fault="dies")
    failed = desk.wait(deadly, lambda status: status.is_over)
    assert failed.state == "failed"
    assert "broken off 3 times" in failed.error
    fine = desk.submit("ann")
    assert desk.wait(fine, lambda status: status.is_over).state == "done"


def test_a_users_error_is_a_sentence_and_a_fault_of_the_program_names_the_log(desk: Desk) -> None:
    wrong = desk.wait(desk.submit("ann", fault="user"), lambda status: status.is_over)
    assert (wrong.state, wrong.error) == ("failed", "--runs: found 0, expected 1 or more")
    bug = desk.wait(desk.submit("ann", fault="program"), lambda status: status.is_over)
    assert "a fault in the program" in bug.error
    assert "ZeroDivisionError: a made-up fault" in (desk.home / "requests" / "runner.log").read_text()
    unknown = desk.wait(desk.submit("ann", command="evil"), lambda status: status.is_over)
    assert "no question is called evil; the runner answers: odd" in unknown.error


def test_the_work_goes_on_when_the_asking_process_ends(desk: Desk) -> None:
    """The asking process is a whole session of its own that is killed at once, as a closed terminal does."""
    code = (
        "import sys; from pathlib import Path; from planner import runner;"
        "print(runner.submit({'command': 'odd', 'name': 'desk', 'runs': 60, 'seconds': 0.02}, user='ann',"
        " home=Path(sys.argv[1]), program=(sys.argv[2],)), flush=True); import time; time.sleep(60)"
    )
    command = [sys.executable, "-W", "ignore", "-c", code, str(desk.home), *PROGRAM]
    screen = subprocess.Popen(command, stdout=subprocess.PIPE, text=True, start_new_session=True)
    name = screen.stdout.readline().strip()
    os.killpg(screen.pid, signal.SIGHUP)
    screen.communicate()
    assert desk.wait(name, lambda status: status.is_over).state == "done"
    assert desk.status(name).tries == 1
    assert desk.figures(name) == _expected(60)


def test_the_runner_ends_when_nothing_is_asked_and_leaves_no_worker(
    desk: Desk, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("ODD_IDLE", "0.5")
    desk.wait(desk.submit(), lambda status: status.is_over)
    (alive,) = desk.runners()
    workers = alive.children(recursive=True)
    assert workers
    _, left = psutil.wait_procs([alive, *workers], timeout=10)
    assert left == []
    assert not runner_lives(desk.home)
    assert desk.wait(desk.submit(), lambda status: status.is_over).state == "done"


def test_a_request_of_another_program_version_waits_for_its_own_runner(desk: Desk) -> None:
    """After an update the old runner must not answer for the new program."""
    desk.wait(desk.submit(), lambda status: status.is_over)
    (old,) = desk.runners()
    folder = desk.home / "requests" / "fff"
    folder.mkdir()
    body = {"asked": {"command": "odd", "name": "new", "runs": 1}, "user": "bob", "at": time.time(), "sources": "new"}
    write_json(folder / "request.json", body)
    psutil.wait_procs([old], timeout=10)
    assert not runner_lives(desk.home)
    assert read_status(folder).state == "waiting"


def test_a_name_that_is_a_path_or_unknown_is_refused(tmp_path: Path) -> None:
    for name in ("../secrets", "", "a/b", "A"):
        with pytest.raises(RequestError, match="the name of a request that was handed in"):
            runner.status(name, home=tmp_path)
    with pytest.raises(RequestError, match="request: found abc"):
        runner.status("abc", home=tmp_path)
    with pytest.raises(RequestError, match="no command"):
        runner.submit({}, user="ann", home=tmp_path)


def test_a_home_that_cannot_be_written_is_a_clear_error(tmp_path: Path) -> None:
    (tmp_path / "home").write_text("")
    with pytest.raises(SavedRunsError, match=r"the request cannot be written to .*: Not a directory"):
        runner.submit({"command": "odd"}, user="ann", home=tmp_path / "home")


def test_every_question_of_the_runner_has_a_function_that_answers_it() -> None:
    for name in runner_process.ANSWERS.values():
        wanted = {"request", "progress", "cancelled", "notice", "note"}
        assert set(inspect.signature(runner_process._load(name)).parameters) == wanted
