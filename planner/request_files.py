"""Requests as files: a folder each, which the screen and the runner read and write without waiting for each other.

    HOME/requests/ID/request.json   what was asked, by whom; written once
                     status.json    how far it is; replaced as a whole, by the runner alone
                     answer.json    what came out, once it is done
                     cancel         there once somebody wants it to stop
    HOME/requests/runner.lock       held by the runner as long as it lives
                  runner.log        what it said

A file is written aside and renamed, so that nobody reads half of it. The lock is the system's own: it is free the
moment its holder is gone, however it went.
"""

from __future__ import annotations

import json
import os
import sys
import time
from pathlib import Path
from typing import IO, Any, NamedTuple

STATES = ("waiting", "running", "done", "cancelled", "failed")


class Status(NamedTuple):
    """How far a request is. ``seconds_left`` is None while unknown; ``note`` is what there is to say in between.

    ``study`` names the saved study once there is one; ``error`` is a sentence for the user; ``tries`` counts the
    runners that took it up; ``at`` is when this was written (seconds since 1970).
    """

    id: str
    user: str
    command: str
    state: str = "waiting"
    done: int = 0
    total: int = 0
    seconds_left: float | None = None
    message: str = ""
    note: dict[str, Any] = {}  # noqa: RUF012  (never changed: a status is replaced as a whole)
    study: str | None = None
    error: str | None = None
    tries: int = 0
    at: float = 0.0

    @property
    def is_over(self) -> bool:
        return self.state in ("done", "cancelled", "failed")


def folder_of(home: Path) -> Path:
    return home / "requests"


def write_json(path: Path, body: Any) -> None:
    """Replace a file as a whole."""
    aside = path.with_name(f".{path.name}-{os.getpid()}-{time.monotonic_ns()}")
    aside.write_text(json.dumps(body, ensure_ascii=False), encoding="utf-8")
    aside.replace(path)


def read_json(path: Path) -> Any:
    """Return a file's content, or None when it is not there or no JSON."""
    try:
        return json.loads(path.read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return None


def read_status(folder: Path) -> Status | None:
    """Return a request's status; None for a folder that holds no request."""
    request = read_json(folder / "request.json")
    if not isinstance(request, dict):
        return None
    body = read_json(folder / "status.json")
    if not isinstance(body, dict):
        at = request.get("at", 0.0)
        return Status(id=folder.name, user=request["user"], command=request["asked"]["command"], at=at)
    return Status(**body)


def write_status(folder: Path, status: Status) -> Status:
    """Write a request's status with the time; on a full disk the old one stays."""
    stamped = status._replace(at=time.time())
    try:
        write_json(folder / "status.json", stamped._asdict())
    except OSError:
        return status
    return stamped


def open_lock(home: Path) -> IO[bytes]:
    """Open the runner's lock file without taking it."""
    folder_of(home).mkdir(parents=True, exist_ok=True)
    return (folder_of(home) / "runner.lock").open("ab")


def take(lock: IO[bytes]) -> bool:
    """Take the lock if it is free; it is given back when the file is closed or the process ends."""
    try:
        if sys.platform == "win32":
            import msvcrt

            lock.seek(0)
            msvcrt.locking(lock.fileno(), msvcrt.LK_NBLCK, 1)
        else:
            import fcntl

            fcntl.flock(lock, fcntl.LOCK_EX | fcntl.LOCK_NB)
    except OSError:
        return False
    return True


def runner_lives(home: Path) -> bool:
    """Return whether a runner holds the lock."""
    with open_lock(home) as lock:
        return not take(lock)
