"""Where jobs run is an argument: in this process, on a pool of this machine's cores, on a cluster; the same function.

``execute(job, payload, tasks, where=...)`` yields each task with its row in the order of the tasks, whatever order the
work was done in, so that the same digits come out anywhere. Tasks are sent in chunks of about a quarter of a second,
two or three a worker at a time; what a lost worker had is sent again; what has come back is kept at once.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from dataclasses import dataclass
from typing import Any, Literal

from planner.chunk import Job, Task
from planner.execute_tally import Listener, Tally
from planner.execute_window import Place, Window
from planner.kept import Kept
from sim.errors import RequestError


@dataclass(frozen=True, slots=True, kw_only=True)
class Where:
    """Where jobs run: ``here``, on a ``pool`` of ``workers`` processes (None: one a core), on a ``cluster``."""

    kind: Literal["here", "pool", "cluster"] = "pool"
    workers: int | None = None
    address: str = ""


def where_from(workers: int | None, cluster: str | None) -> Where:
    """Return the place that the options ``--workers`` and ``--cluster`` name."""
    if workers is not None and workers < 1:
        raise RequestError("--workers", str(workers), "1 or more", "leave it out to use every core")
    if cluster is not None:
        return Where(kind="cluster", address=cluster, workers=workers)
    return Where(kind="here") if workers == 1 else Where(kind="pool", workers=workers)


def execute(
    job: Job,
    payload: Any,
    tasks: Sequence[Task],
    *,
    where: Where,
    kept: Kept[Any] | None = None,
    progress: Listener | None = None,
    cancelled: Callable[[], bool] = lambda: False,
    notice: Callable[[str], None] = lambda text: None,
) -> Iterator[tuple[Task, Any]]:
    """Yield (task, ``job(payload, *task)``) in the order of ``tasks``; stop early by closing the iterator.

    ``job`` is a function that can be imported by name; ``payload`` travels once to each worker. ``kept`` gives rows
    that are at hand and keeps new ones; ``progress`` hears how far the work is; once ``cancelled()`` is true the
    iterator ends, and what it yielded is a prefix without gaps; ``notice`` takes sentences for the user. An exception
    of a job is raised when its task's turn comes; LostWorkersError when the work cannot go on.
    """
    tally = Tally(tasks=list(tasks), kept=kept, progress=progress, notice=notice)
    if where.kind == "here":
        yield from _run_here(job, payload, tally, cancelled)
        return
    if not tally.todo:
        yield from tally.out()
        return
    place: Place = _opened(where, notice)
    window = Window(job, payload, tally=tally, place=place)
    try:
        while not cancelled():
            for task, row in tally.out():
                yield task, row
                if cancelled():
                    return
            if tally.is_over:
                return
            window.fill()
            window.collect()
            tally.tell()
    finally:
        window.give_up()
        place.close()


def _run_here(job: Job, payload: Any, tally: Tally, cancelled: Callable[[], bool]) -> Iterator[tuple[Task, Any]]:
    """Compute one task after the other in this process."""
    while not cancelled():
        for task, row in tally.out():
            yield task, row
            if cancelled():
                return
        if tally.is_over:
            return
        (index,) = tally.next_chunk(1)
        tally.receive(index, job(payload, *tally.tasks[index]))
        tally.tell()


def _opened(where: Where, notice: Callable[[str], None]) -> Place:
    """Open a place; each kind's library is loaded only when it is asked for."""
    if where.kind == "pool":
        from planner.execute_pool import Pool

        return Pool(where.workers, notice)
    try:
        from planner.execute_cluster import Cluster
    except ImportError as error:
        remedy = "pip install 'spoolwright[cluster]'"
        raise RequestError("--cluster", f"no library {error.name}", "the optional libraries", remedy) from None
    return Cluster(where.address, where.workers, notice)
