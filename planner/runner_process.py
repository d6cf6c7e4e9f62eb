"""The detached process that answers the screen's requests: `python -m planner.runner_process HOME`.

It owns the pool of workers. One request of each user is worked on at a time, in a thread of its own; threads share the
pool chunk by chunk, so that a short question of one user does not wait for the long study of another. It ends when
nothing was asked for a while.
"""

from __future__ import annotations

import importlib
import math
import shutil
import sys
import threading
import time
import traceback
from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any, Protocol

from planner.fingerprint import sources
from planner.request_files import (
    Status,
    folder_of,
    open_lock,
    read_json,
    read_status,
    take,
    write_json,
    write_status,
)
from sim.errors import UserError

ANSWERS: dict[str, str] = {"compare": "planner.answering:answer"}
"""Which function answers which command; a request can name no other."""

AT_ONCE = 4
MOST_TRIES = 3
TICK_SECONDS = 0.1
STATUS_SECONDS = 0.2
IDLE_SECONDS = 600.0
KEPT_SECONDS = 7 * 24 * 3600.0
MAKE_WAY_SECONDS = 3600.0


class Answerer(Protocol):
    """A function that answers a request; its result is plain JSON, with ``study`` naming a saved study."""

    def __call__(
        self,
        request: dict[str, Any],
        *,
        progress: Callable[[int, int, float], None],
        cancelled: Callable[[], bool],
        notice: Callable[[str], None],
        note: Callable[[dict[str, Any]], None],
    ) -> dict[str, Any]: ...


class _Request:
    """One request in work: its thread, and what it tells in between."""

    def __init__(self, folder: Path, status: Status, answerer: Callable[[], Answerer]) -> None:
        self.folder = folder
        self.user = status.user
        self._status = write_status(folder, status._replace(state="running", tries=status.tries + 1))
        self._answerer = answerer
        self._written = 0.0
        self.thread = threading.Thread(target=self._work, name=status.id, daemon=True)
        self.thread.start()

    def cancelled(self) -> bool:
        return (self.folder / "cancel").exists()

    def _progress(self, done: int, total: int, seconds_left: float) -> None:
        left = seconds_left if math.isfinite(seconds_left) else None
        self._tell(self._status._replace(done=done, total=total, seconds_left=left))

    def _notice(self, text: str) -> None:
        self._tell(self._status._replace(message=text), at_once=True)

    def _note(self, note: dict[str, Any]) -> None:
        self._tell(self._status._replace(note=note), at_once=True)

    def _tell(self, status: Status, *, at_once: bool = False) -> None:
        self._status = status
        if at_once or time.monotonic() - self._written > STATUS_SECONDS:
            self._written = time.monotonic()
            write_status(self.folder, status)

    def _work(self) -> None:
        """Answer, and write what became of it."""
        request = read_json(self.folder / "request.json")["asked"]
        try:
            result = self._answerer()(
                request,
                progress=self._progress,
                cancelled=self.cancelled,
                notice=self._notice,
                note=self._note,
            )
            write_json(self.folder / "answer.json", result)
            state = "cancelled" if self.cancelled() else "done"
            over = self._status._replace(state=state, study=result.get("study"), seconds_left=0.0)
        except UserError as error:
            over = self._status._replace(state="failed", error=str(error))
        except OSError as error:
            over = self._status._replace(state="failed", error=f"the answer could not be written: {error.strerror}")
        except Exception as error:
            traceback.print_exc()
            over = self._status._replace(state="failed", error=f"a fault in the program ({error!r}); see runner.log")
        write_status(self.folder, over)


class Runner:
    """The requests of one home, and those of them that are in work."""

    def __init__(self, home: Path, answers: Mapping[str, Answerer | str] = ANSWERS) -> None:
        self._requests = folder_of(home)
        self._answers = answers
        self._working: dict[str, _Request] = {}
        self.must_make_way = False

    def tick(self) -> bool:
        """Take up what waits; return whether there is anything in work."""
        self._working = {name: request for name, request in self._working.items() if request.thread.is_alive()}
        self.must_make_way = False
        for folder in sorted(path for path in self._requests.iterdir() if path.is_dir() and path.name[0] != "."):
            status = None if folder.name in self._working else read_status(folder)
            if status is None:
                continue
            age = time.time() - status.at
            if age > KEPT_SECONDS:
                shutil.rmtree(folder, ignore_errors=True)
            elif status.is_over:
                continue
            elif not is_ours(folder):
                self.must_make_way |= age < MAKE_WAY_SECONDS
            elif (folder / "cancel").exists() and status.state == "waiting":
                write_status(folder, status._replace(state="cancelled"))
            elif status.tries >= MOST_TRIES:
                error = f"the work was broken off {status.tries} times from outside; see runner.log"
                write_status(folder, status._replace(state="failed", error=error))
            elif len(self._working) < AT_ONCE and status.user not in self._users():
                self._take_up(folder, status)
        return bool(self._working)

    def _users(self) -> set[str]:
        return {request.user for request in self._working.values()}

    def _take_up(self, folder: Path, status: Status) -> None:
        if status.command not in self._answers:
            known = ", ".join(sorted(self._answers))
            error = f"no question is called {status.command}; the runner answers: {known}"
            write_status(folder, status._replace(state="failed", error=error))
            return
        self._working[folder.name] = _Request(folder, status, lambda: _load(self._answers[status.command]))


def _load(answerer: Answerer | str) -> Answerer:
    """Return the function that a name stands for; its libraries load with the first request."""
    if not isinstance(answerer, str):
        return answerer
    module, name = answerer.split(":")
    function: Answerer = getattr(importlib.import_module(module), name)
    return function


def serve(home: Path, *, answers: Mapping[str, Answerer | str] = ANSWERS, idle_seconds: float = IDLE_SECONDS) -> None:
    """Answer requests until nothing was asked for ``idle_seconds``; return at once when another runner lives."""
    while True:
        with open_lock(home) as lock:
            if not take(lock):
                return
            runner = Runner(home, answers)
            busy_at = time.monotonic()
            while time.monotonic() - busy_at < idle_seconds:
                if runner.tick():
                    busy_at = time.monotonic()
                elif runner.must_make_way:
                    return
                time.sleep(TICK_SECONDS)
        # A request that came while the lock was still held found a living runner: look once more without it.
        if not any(_waits(folder) for folder in folder_of(home).iterdir() if folder.is_dir()):
            return


def is_ours(folder: Path) -> bool:
    """Return whether a request was made by a program of these very sources.

    After an update the screen's requests need a runner of the new program: this one ends once its own are answered,
    and the screen, which looks at its request every second, starts the other.
    """
    request = read_json(folder / "request.json")
    return isinstance(request, dict) and request.get("sources") == sources()


def _waits(folder: Path) -> bool:
    status = read_status(folder) if folder.name[0] != "." else None
    return status is not None and not status.is_over and is_ours(folder)


if __name__ == "__main__":
    serve(Path(sys.argv[1]))
