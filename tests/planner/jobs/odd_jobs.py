"""Small jobs with a row that can be foretold, some of them with a fault: what tests of running and saving work on."""

from __future__ import annotations

import hashlib
import os
import signal
import sys
import time
from pathlib import Path
from typing import Any, NamedTuple

import numpy as np

from sim.errors import RequestError


class OddRow(NamedTuple):
    """What one run of these jobs leaves."""

    total_usd: float
    curve: np.ndarray
    removals: int


def steady(payload: dict[str, Any], strategy: str, run: int) -> OddRow:
    """Return a row that depends on the payload, the strategy and the run alone, after the payload's ``seconds``."""
    time.sleep(payload.get("seconds", 0.0))
    digest = hashlib.sha256(f"{payload['name']}/{strategy}/{run}".encode()).digest()
    numbers = np.frombuffer(digest, dtype=np.uint8).astype(float)
    return OddRow(float(np.exp(numbers[0] / 50.0)), np.log1p(numbers), int(digest[1]))


def kills_its_worker_once(payload: dict[str, Any], strategy: str, run: int) -> OddRow:
    """Be killed in mid-run the first time that run ``kill_at`` comes up; the marker file remembers that it was."""
    if run == payload["kill_at"]:
        marker = Path(payload["marker"])
        if not marker.exists():
            marker.touch()
            os.kill(os.getpid(), signal.SIGKILL)
    return steady(payload, strategy, run)


def kills_its_worker_always(payload: dict[str, Any], strategy: str, run: int) -> OddRow:
    if run == payload["kill_at"]:
        os.kill(os.getpid(), signal.SIGKILL)
    return steady(payload, strategy, run)


def fails_at_a_run(payload: dict[str, Any], strategy: str, run: int) -> OddRow:
    if run == payload["fail_at"]:
        raise RequestError("run", str(run), "another run")
    return steady(payload, strategy, run)


def tells_its_process(payload: dict[str, Any], strategy: str, run: int) -> OddRow:
    """Return the process that did the run, and in ``removals`` whether pandas was loaded there."""
    time.sleep(payload.get("seconds", 0.0))
    return OddRow(float(os.getpid()), np.zeros(1), int("pandas" in sys.modules))
