"""Jobs on this machine's cores: a pool of processes that stays warm between studies.

loky's pool starts its processes without running the main program again, so that it works under the screen's server
too, and is made anew after a process in it was killed.
"""

from __future__ import annotations

import os
import signal
import tempfile
import threading
import time
from collections.abc import Callable, Iterator
from concurrent.futures import Future
from contextlib import contextmanager
from pathlib import Path
from types import FrameType

import loky

from planner.chunk import Done, Missing, Refused, work
from planner.identity import Identity
from sim.errors import RequestError

IDLE_SECONDS = 300
"""How long an idle process waits for the next what-if before it ends."""

LOOK_SECONDS = 1.0

# One thread a process: the pool has a process for each core already.
_ENVIRONMENT = {"OMP_NUM_THREADS": "1", "OPENBLAS_NUM_THREADS": "1", "MKL_NUM_THREADS": "1"}


def _begin(parent: int) -> None:
    """Leave Ctrl-C to the parent, which keeps what is finished and ends the work in order; and end when it is gone."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)
    threading.Thread(target=_end_with, args=(parent,), daemon=True).start()


def _end_with(parent: int) -> None:
    """End this process once its parent is gone: a killed parent tells nobody, and its pool would wait for ever."""
    while os.getppid() == parent:
        time.sleep(LOOK_SECONDS)
    os._exit(1)


class Pool:
    """A window onto the one pool of this process."""

    def __init__(self, workers: int | None, notice: Callable[[str], None]) -> None:
        self.workers = workers or cores()
        self._notice = notice
        self._wanted = _sign()
        self._executor = self._open()

    def _open(self) -> loky.ProcessPoolExecutor:
        with _interrupts_held():
            return loky.get_reusable_executor(
                max_workers=self.workers,
                timeout=IDLE_SECONDS,
                initializer=_begin,
                initargs=(os.getpid(),),
                env=_ENVIRONMENT,
            )

    @property
    def wanted(self) -> str:
        return self._wanted

    def submit(self, expected: Identity, packed_chunk: bytes) -> Future[Done | Missing | Refused]:
        with _interrupts_held():
            future: Future[Done | Missing | Refused] = self._executor.submit(work, expected, packed_chunk)
        return future

    def tick(self) -> bool:
        return False

    def mend(self) -> None:
        self._executor = self._open()

    def refuse(self, refused: Refused) -> None:
        """A process of this very machine differs: the sources were changed while the program ran."""
        raise RequestError(
            f"worker {refused.who.process} on this machine",
            refused.why,
            "the program that the study was started with",
            "start the command again",
        )

    def close(self) -> None:
        """Leave the pool warm for the next study; chunks that nobody waits for end with the run they are at.

        The pool cannot take back what already lies in its queue, and the next what-if would wait for that.
        """
        if self._wanted:
            Path(self._wanted).unlink(missing_ok=True)


@contextmanager
def _interrupts_held() -> Iterator[None]:
    """Hold Ctrl-C back until the block ends.

    In the midst of handing a chunk over it leaves the pool with work that nobody does, and the program would wait for
    that at its end for ever (seen once in 160 interrupted studies).
    """
    before = signal.getsignal(signal.SIGINT)
    if threading.current_thread() is not threading.main_thread() or not callable(before):
        yield  # only the main thread is interrupted, and only by a handler that Python knows
        return
    came: list[tuple[int, FrameType | None]] = []
    signal.signal(signal.SIGINT, lambda number, frame: came.append((number, frame)))
    try:
        yield
    finally:
        signal.signal(signal.SIGINT, before)
    if came:
        before(*came[0])


def _sign() -> str:
    """Return a new empty file, or nothing where none can be made: then chunks run to their end."""
    try:
        handle, name = tempfile.mkstemp(prefix="spoolwright-")
    except OSError:
        return ""
    os.close(handle)
    return name


def cores() -> int:
    """Return how many cores this process may use, as the system and its limits have it."""
    count: int = loky.cpu_count()
    return count
