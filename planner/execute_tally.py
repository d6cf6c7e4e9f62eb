"""The tasks of one study while it runs: what is done, what is lost, what is still to be sent, what comes out next."""

from __future__ import annotations

import math
import time
from collections import deque
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from typing import Any, Protocol

from planner.chunk import Done, Task
from planner.kept import Kept


class Listener(Protocol):
    """Who wants to hear how far the work is: runs done, runs in all, seconds left (NaN while unknown)."""

    def __call__(self, done: int, total: int, seconds_left: float) -> None: ...


@dataclass(slots=True, kw_only=True)
class Tally:
    """Rows come in by index, in any order; tasks with their rows go out in order."""

    tasks: list[Task]
    kept: Kept[Any] | None
    progress: Listener | None
    notice: Callable[[str], None]
    todo: deque[int] = field(init=False)
    lost: deque[list[int]] = field(init=False, default_factory=deque)
    at_hand: int = field(init=False)
    computed: int = field(init=False, default=0)
    seconds_a_task: float = field(init=False, default=math.nan)
    _rows: dict[int, Any] = field(init=False, default_factory=dict)
    _errors: dict[int, BaseException] = field(init=False, default_factory=dict)
    _next: int = field(init=False, default=0)
    _started: float = field(init=False, default_factory=time.monotonic)
    _troubled: bool = field(init=False, default=False)

    def __post_init__(self) -> None:
        self.todo = deque(i for i, task in enumerate(self.tasks) if self.kept is None or task not in self.kept)
        self.at_hand = len(self.tasks) - len(self.todo)

    @property
    def done(self) -> int:
        return self.at_hand + self.computed

    @property
    def is_over(self) -> bool:
        return self._next == len(self.tasks)

    def out(self) -> Iterator[tuple[Task, Any]]:
        """Yield the tasks whose turn it is and whose rows are there; raise a job's error when its turn comes."""
        while not self.is_over:
            at, task = self._next, self.tasks[self._next]
            if at in self._errors:
                raise self._errors[at]
            if at in self._rows:
                row = self._rows.pop(at)
            elif self.kept is not None and task in self.kept:
                row = self.kept.get(task)
            else:
                return
            self._next += 1
            yield task, row

    def receive(self, index: int, row: Any) -> None:
        """Take a row in, and keep it before anything else is done with it."""
        self._rows[index] = row
        self.computed += 1
        if self.kept is not None:
            self.kept.put(self.tasks[index], row)
            if self.kept.trouble and not self._troubled:
                self._troubled = True
                self.notice(self.kept.trouble)

    def receive_chunk(self, indexes: list[int], done: Done) -> None:
        """Take a chunk's rows in; what did not come, such as what stood behind a task that failed, is sent again."""
        for index, row in zip(indexes, done.rows, strict=False):
            self.receive(index, row)
        rest = indexes[len(done.rows) :]
        if done.error is not None and rest:
            self._errors[rest.pop(0)] = done.error
        self.lose(rest)
        if done.rows:
            pace = done.seconds / len(done.rows)
            # The slower of the two, fading: a chunk that is too short costs less than one that is too long.
            self.seconds_a_task = pace if math.isnan(self.seconds_a_task) else max(pace, 0.7 * self.seconds_a_task)

    def lose(self, indexes: list[int]) -> None:
        """Note tasks to be sent again, each alone, so that one that kills its worker is found out."""
        self.lost.extend([index] for index in indexes)

    def next_chunk(self, size: int) -> list[int]:
        """Return the tasks to send next: what was lost first."""
        if self.lost:
            return self.lost.popleft()
        return [self.todo.popleft() for _ in range(min(size, len(self.todo)))]

    def tell(self) -> None:
        """Report how far the work is."""
        if self.progress is not None:
            pace = (time.monotonic() - self._started) / self.computed if self.computed else math.nan
            left = len(self.tasks) - self.done
            self.progress(self.done, len(self.tasks), left * pace if left else 0.0)
