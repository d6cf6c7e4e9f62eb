"""What a worker does with what it is sent: a few tasks of one job, on a payload that it keeps.

The payload (a scenario) travels once to each worker: a chunk may carry only its key, and a worker that lacks it says
so. Nothing here, nor what a job imports, loads pandas.
"""

from __future__ import annotations

import os
import pickle
import time
import traceback
import zlib
from collections.abc import Callable
from typing import Any, NamedTuple

from planner.identity import Identity, identity

Task = tuple[Any, ...]
Job = Callable[..., Any]

PAYLOADS_KEPT = 4
"""A what-if has a baseline and a variant; two users at once have two of each."""

_payloads: dict[str, Any] = {}


class Chunk(NamedTuple):
    """A few tasks for one worker; ``payload`` is None when the worker is thought to have it.

    ``wanted`` is a file that is there as long as somebody waits for the rows (empty: always).
    """

    job: Job
    payload_key: str
    payload: bytes | None
    tasks: tuple[Task, ...]
    wanted: str


class Done(NamedTuple):
    """Rows in the order of the chunk's tasks; fewer than the tasks when the next one raised ``error`` or was no longer
    wanted."""

    rows: tuple[Any, ...]
    error: BaseException | None
    seconds: float


class Missing(NamedTuple):
    """The worker has no payload of that key: send the chunk again with it."""

    payload_key: str


class Refused(NamedTuple):
    """The worker must not compute for this study: ``why`` names the difference."""

    who: Identity
    why: str


def packed(payload: Any) -> bytes:
    """Return the payload as it travels."""
    return zlib.compress(pickle.dumps(payload, protocol=5), level=1)


def work(expected: Identity, packed_chunk: bytes) -> Done | Missing | Refused:
    """Compute a pickled chunk in this process, if it is alike to the one that asks.

    The chunk is unpickled only then: sources of another version may not even hold what it names.
    """
    here = identity()
    why = here.differs_from(expected)
    if why:
        return Refused(here, why)
    chunk: Chunk = pickle.loads(packed_chunk)
    if chunk.payload_key not in _payloads:
        if chunk.payload is None:
            return Missing(chunk.payload_key)
        while len(_payloads) >= PAYLOADS_KEPT:
            del _payloads[next(iter(_payloads))]
        _payloads[chunk.payload_key] = pickle.loads(zlib.decompress(chunk.payload))
    payload = _payloads[chunk.payload_key]
    start = time.perf_counter()
    rows = []
    for task in chunk.tasks:
        if chunk.wanted and not os.path.exists(chunk.wanted):
            break
        try:
            rows.append(chunk.job(payload, *task))
        except Exception as error:
            return Done(tuple(rows), _portable(error), time.perf_counter() - start)
    return Done(tuple(rows), None, time.perf_counter() - start)


def _portable(error: Exception) -> Exception:
    """Return the error with its traceback as a note, or a stand-in when it cannot travel."""
    note = "".join(traceback.format_exception(error))
    try:
        pickle.loads(pickle.dumps(error))
    except Exception:
        return RuntimeError(f"a job failed in a worker:\n{note}")
    error.add_note(f"in a worker:\n{note}")
    return error
