"""Progress on standard error: a line that moves on a terminal, plain lines elsewhere."""

from __future__ import annotations

import math
import sys
import time


def time_left(seconds: float) -> str:
    """Return seconds in words that a person reads at a glance."""
    if not math.isfinite(seconds):
        return "time left not yet known"
    if seconds < 90:
        return f"about {max(1, round(seconds))} s left"
    return f"about {seconds / 60:.0f} min left" if seconds < 5400 else f"about {seconds / 3600:.1f} h left"


class Progress:
    """Writes ``runs DONE/TOTAL`` with the interval so far and the time left."""

    def __init__(self, per_run: int) -> None:
        self._per_run = max(1, per_run)  # rows a run: one for each strategy
        self._terminal = sys.stderr.isatty()
        self._written = 0.0
        self._note = ""

    def note(self, text: str) -> None:
        """Remember what is known so far, shown with the next step."""
        self._note = text

    def __call__(self, done: int, total: int, seconds_left: float) -> None:
        now = time.monotonic()
        every = 0.2 if self._terminal else 2.0
        if done < total and now - self._written < every:
            return
        self._written = now
        text = f"runs {done // self._per_run}/{-(-total // self._per_run)}, {time_left(seconds_left)}"
        text += f", {self._note}" if self._note else ""
        sys.stderr.write(f"\r\033[K{text}" if self._terminal else f"{text}\n")
        sys.stderr.flush()

    def close(self) -> None:
        """Leave the line, so that what follows starts on its own."""
        if self._terminal and self._written:
            sys.stderr.write("\r\033[K")
            sys.stderr.flush()
