"""Long work for the screen: hand in a request, look how far it is, cancel it. A detached process does the work.

The screen's own process only reads and writes small files, so a page stays alive, a reload finds the study again by
its name, and the work goes on when the screen is closed. The runner is started when there is a request and none lives;
one that died is replaced, and takes up again what the dead one had, with the runs that were kept.
"""

from __future__ import annotations

import secrets
import subprocess
import sys
import time
from collections.abc import Sequence
from pathlib import Path
from typing import Any

from planner.errors import SavedRunsError
from planner.fingerprint import sources
from planner.home import home as users_home
from planner.request_files import Status, folder_of, read_json, read_status, runner_lives, write_json
from sim.errors import RequestError

PROGRAM: tuple[str, ...] = ("-m", "planner.runner_process")

# Started runners, so that one that ended is taken leave of (else it would stay as a zombie of the screen's server).
_started: list[subprocess.Popen[bytes]] = []


def submit(request: dict[str, Any], *, user: str, home: Path | None = None, program: Sequence[str] = PROGRAM) -> str:
    """Hand in a request and return its name; ``request["command"]`` is the question, the rest its options.

    ``user`` is who asks (a session of the screen): one request of each user is worked on at a time.
    """
    if not isinstance(request.get("command"), str):
        raise RequestError("request", "no command", "the name of a question")
    home = home or users_home()
    name = f"{time.time_ns():x}-{secrets.token_hex(4)}"
    aside = folder_of(home) / f".{name}"
    body = {"asked": request, "user": user, "at": time.time(), "sources": sources()}
    try:
        aside.mkdir(parents=True)
        write_json(aside / "request.json", body)
        aside.rename(folder_of(home) / name)
        start_runner(home, program=program)
    except OSError as error:
        remedy = "make room or set SPOOLWRIGHT_HOME to a place that can be written"
        raise SavedRunsError(
            f"the request cannot be written to {home}", error.strerror or str(error), remedy
        ) from error
    return name


def status(name: str, *, home: Path | None = None, program: Sequence[str] = PROGRAM) -> Status:
    """Return how far a request is; a request that nobody works on gets a runner."""
    home = home or users_home()
    found = read_status(_folder(home, name))
    if found is None:
        raise RequestError("request", name, "the name of a request that was handed in")
    if not found.is_over:
        start_runner(home, program=program)
    return found


def answer(name: str, *, home: Path | None = None) -> dict[str, Any] | None:
    """Return what came out of a request, or None as long as it is not done."""
    found = read_json(_folder(home or users_home(), name) / "answer.json")
    return found if isinstance(found, dict) else None


def cancel(name: str, *, home: Path | None = None, program: Sequence[str] = PROGRAM) -> None:
    """Ask a request to stop; it answers within a second and keeps what is done."""
    home = home or users_home()
    if not status(name, home=home, program=program).is_over:
        (_folder(home, name) / "cancel").touch()


def jobs(user: str | None = None, *, home: Path | None = None) -> list[Status]:
    """Return the requests of a user (None: of all), newest first."""
    folder = folder_of(home or users_home())
    if not folder.is_dir():
        return []
    names = sorted((path for path in folder.iterdir() if path.is_dir() and path.name[0] != "."), reverse=True)
    found = [read_status(path) for path in names]
    return [status for status in found if status is not None and user in (None, status.user)]


def start_runner(home: Path, *, program: Sequence[str] = PROGRAM) -> None:
    """Start a runner unless one lives; of two that are started at once, the second ends by itself."""
    _started[:] = [process for process in _started if process.poll() is None]
    if runner_lives(home):
        return
    with (folder_of(home) / "runner.log").open("ab") as log:
        process = subprocess.Popen(
            [sys.executable, *program, str(home)],
            cwd=home,
            stdin=subprocess.DEVNULL,
            stdout=log,
            stderr=log,
            start_new_session=True,  # it outlives the screen's server and the terminal
        )
    _started.append(process)
    _wait_until_it_lives(home, process)


def _wait_until_it_lives(home: Path, process: subprocess.Popen[bytes]) -> None:
    """Give the runner a moment to take its lock, so that the next look does not start another."""
    until = time.monotonic() + 5.0
    while time.monotonic() < until and process.poll() is None and not runner_lives(home):
        time.sleep(0.02)


def _folder(home: Path, name: str) -> Path:
    """Return a request's folder; its name comes from a page's address, so it must be a name and no path."""
    if not name or not all(letter in "0123456789abcdef-" for letter in name):
        raise RequestError("request", repr(name), "the name of a request that was handed in")
    return folder_of(home) / name
