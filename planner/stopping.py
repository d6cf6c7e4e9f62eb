"""Ctrl-C that keeps what is done: the first one asks the work to stop, a second one breaks off."""

from __future__ import annotations

import signal
import sys
import threading
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from types import FrameType


@contextmanager
def stop_on_interrupt() -> Iterator[Callable[[], bool]]:
    """Yield a function that says whether to stop. Outside the main thread nothing is caught."""
    stop = threading.Event()

    def interrupt(number: int, frame: FrameType | None) -> None:
        del number, frame
        if stop.is_set():
            raise KeyboardInterrupt
        stop.set()
        sys.stderr.write("\nstopping; what is done is kept\n")

    if threading.current_thread() is not threading.main_thread():
        yield stop.is_set
        return
    previous = signal.signal(signal.SIGINT, interrupt)
    try:
        yield stop.is_set
    finally:
        signal.signal(signal.SIGINT, previous)
