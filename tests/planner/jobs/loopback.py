"""A cluster of real processes on loopback, for tests that kill parts of it."""

from __future__ import annotations

import json
import os
import subprocess
import sys
import time
from collections.abc import Callable
from pathlib import Path

ROOT = Path(__file__).resolve().parents[3]
JOBS = Path(__file__).parent


class LoopbackCluster:
    """A scheduler and workers, each a process of its own; every one is ended, whatever a test does to it."""

    def __init__(self, folder: Path) -> None:
        self.folder = folder
        self.processes: list[subprocess.Popen] = []
        self.contact = folder / "scheduler.json"
        options = ("--host", "127.0.0.1", "--port", "0", "--no-dashboard", "--scheduler-file")
        self.scheduler = self._start("scheduler", *options)
        self._wait(self.contact.exists)
        self.address = json.loads(self.contact.read_text())["address"]

    def worker(self, *, sources: Path = ROOT) -> subprocess.Popen:
        """Start a worker that runs the Spoolwright under ``sources``."""
        options = ("--nthreads", "1", "--no-nanny", "--no-dashboard", "--host", "127.0.0.1", "--scheduler-file")
        return self._start("worker", *options, sources=sources)

    def _start(self, *options: str, sources: Path = ROOT) -> subprocess.Popen:
        path = os.pathsep.join((str(sources), str(JOBS)))
        process = subprocess.Popen(
            [sys.executable, "-m", "dask", *options, str(self.contact)],
            cwd=self.folder,
            env={**os.environ, "PYTHONPATH": path},
            stdout=subprocess.DEVNULL,
            stderr=subprocess.DEVNULL,
        )
        self.processes.append(process)
        return process

    def _wait(self, is_true: Callable[[], bool]) -> None:
        until = time.monotonic() + 30.0
        while not is_true():
            assert time.monotonic() < until, "the scheduler did not start"
            time.sleep(0.05)

    def close(self) -> None:
        for process in reversed(self.processes):
            process.kill()
            process.wait()
