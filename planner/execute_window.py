"""What is on its way to workers: a window of chunks, filled as they come back, sent again when they are lost."""

from __future__ import annotations

import math
import pickle
import time
from concurrent.futures import FIRST_COMPLETED, Future, wait
from typing import Any, Protocol

from planner.chunk import Chunk, Done, Job, Missing, Refused, packed
from planner.errors import LostWorkersError
from planner.execute_tally import Tally
from planner.fingerprint import of
from planner.identity import Identity, identity

CHUNK_SECONDS = 0.25
"""Long enough that sending costs little, short enough that cancelling is felt at once."""

CHUNKS_A_WORKER = 3
"""One in work, the others so that the worker never waits for the next."""

TICK_SECONDS = 0.05
MOST_BREAKS = 3

Answer = Done | Missing | Refused


class Place(Protocol):
    """Something that takes chunks; its futures are those of ``concurrent.futures``."""

    @property
    def workers(self) -> int:
        """How many chunks it can work on at once; 0 while it waits for workers."""
        ...

    @property
    def wanted(self) -> str:
        """A file that tells workers that somebody still waits, as far as they can see it; else empty."""
        ...

    def submit(self, expected: Identity, packed_chunk: bytes) -> Future[Answer]:
        """Have ``chunk.work`` called with these somewhere."""
        ...

    def tick(self) -> bool:
        """Look after the workers; return whether all that is on its way must be sent again."""
        ...

    def mend(self) -> None:
        """Make ready again after a worker broke; LostWorkersError when that cannot be."""
        ...

    def refuse(self, refused: Refused) -> None:
        """Take note of a worker that must not compute."""
        ...

    def close(self) -> None: ...


class Window:
    """The chunks that are on their way to one place."""

    def __init__(self, job: Job, payload: Any, *, tally: Tally, place: Place) -> None:
        self._job, self._tally, self._place = job, tally, place
        self._payload = packed(payload)
        self._payload_key = of(self._payload)
        self._expected = identity()
        self._on_way: dict[Future[Answer], list[int]] = {}
        self._brought = 0
        self._breaks = 0

    def fill(self) -> None:
        """Send chunks until the window is full or nothing is left to send."""
        tally = self._tally
        while len(self._on_way) < CHUNKS_A_WORKER * self._place.workers and (tally.lost or tally.todo):
            # The first chunks bring the payload; a worker that comes later asks for it.
            self._brought += 1
            self._send(tally.next_chunk(self._size()), bring=self._brought <= self._place.workers)

    def collect(self) -> None:
        """Wait a moment for chunks and take in those that came."""
        try:
            if self._place.tick():
                self.give_up()
        except LostWorkersError as lost:
            raise self._counted(lost) from None
        if not self._on_way:
            time.sleep(TICK_SECONDS if not self._place.workers else 0.0)
            return
        came, _ = wait(self._on_way, timeout=TICK_SECONDS, return_when=FIRST_COMPLETED)
        for future in came:
            indexes = self._on_way.pop(future, None)
            if indexes is None:
                continue  # taken back, when the place broke while an earlier one of these was taken in
            error = _failure_of(future)
            if error is not None:
                self._tally.lose(indexes)
                self._break(error)
                return
            self._take(indexes, future.result())

    def give_up(self) -> None:
        """Take back all that is on its way."""
        for future, indexes in self._on_way.items():
            future.cancel()
            self._tally.lose(indexes)
        self._on_way.clear()

    def _size(self) -> int:
        """Return how many tasks make a chunk: one while the pace is unknown, a fair share near the end."""
        pace = self._tally.seconds_a_task
        if math.isnan(pace):
            return 1
        share = math.ceil(len(self._tally.todo) / (4 * self._place.workers))
        return max(1, min(int(CHUNK_SECONDS / max(pace, 1e-6)), share))

    def _send(self, indexes: list[int], *, bring: bool) -> None:
        tasks = tuple(self._tally.tasks[index] for index in indexes)
        payload = self._payload if bring else None
        try:
            chunk = Chunk(self._job, self._payload_key, payload, tasks, self._place.wanted)
            future = self._place.submit(self._expected, pickle.dumps(chunk, protocol=5))
        except (RuntimeError, OSError) as error:  # it broke between two chunks
            self._tally.lose(indexes)
            self._break(error)
            return
        self._on_way[future] = indexes

    def _take(self, indexes: list[int], answer: Answer) -> None:
        if isinstance(answer, Missing):
            self._send(indexes, bring=True)
        elif isinstance(answer, Refused):
            self._place.refuse(answer)
            self._tally.lose(indexes)
        else:
            self._breaks = 0
            self._tally.receive_chunk(indexes, answer)

    def _break(self, error: BaseException) -> None:
        """Save what came back, send the rest again, and give up when nothing is finished between several breaks."""
        for future in [future for future in self._on_way if future.done() and _failure_of(future) is None]:
            answer = future.result()
            if isinstance(answer, Done):
                self._take(self._on_way.pop(future), answer)
        self._breaks += 1
        self.give_up()
        why = type(error).__name__
        try:
            if self._breaks >= MOST_BREAKS:
                suspects = ", ".join(str(self._tally.tasks[indexes[0]]) for indexes in list(self._tally.lost)[:3])
                raise LostWorkersError(
                    f"a worker died {self._breaks} times without finishing a run ({why}); in work: {suspects}",
                    0,
                    0,
                    "look for what kills it (memory?), then start the same command again with --resume",
                )
            self._tally.notice(f"a worker was lost ({why}): what it had is done again")
            self._place.mend()
        except LostWorkersError as lost:
            raise self._counted(lost) from error

    def _counted(self, lost: LostWorkersError) -> LostWorkersError:
        """Return the error with the runs that are finished, which a place does not know."""
        return LostWorkersError(lost.what, self._tally.done, len(self._tally.tasks), lost.remedy)


def _failure_of(future: Future[Answer]) -> BaseException | None:
    """Return what became of a finished future when it is no answer."""
    if future.cancelled():
        return RuntimeError("cancelled by the place")
    return future.exception()
