"""From the words of the command line to a comparison: options read, progress shown, Ctrl-C keeping what is done."""

from __future__ import annotations

import signal
import sys
import threading
from collections.abc import Mapping
from pathlib import Path
from types import FrameType
from typing import Any

from planner.answering import Answered, compare
from planner.execute import where_from
from planner.progress import Progress
from planner.scenario import WhatIf
from planner.sequential import Verdict
from planner.study import CompareRequest
from sim.errors import RequestError
from sim.fleet import Holding


def request_of(asked: Mapping[str, Any]) -> CompareRequest:
    """Return the request that the options ask for. Raises RequestError for holdings that cannot be read."""
    common, own = _holdings(asked["holdings"])
    return CompareRequest(
        strategies=tuple(asked["strategies"]),
        runs=asked["runs"],
        precision_frac=asked["precision"],
        seed=asked["seed"],
        same_money=asked["same_money"],
        sweep=asked["sweep"],
        stock_of=tuple((name, tuple(rows)) for name, rows in own.items()),
        what_if=WhatIf(
            stock=tuple(common),
            build_goal_cycles=asked["build_goal"],
            turn_time_factor=asked["turn_time_factor"],
            fuel_price_usd_per_kg=asked["fuel_price"],
            horizon_years=asked["horizon"],
        ),
    )


def _tell(text: str) -> None:
    sys.stderr.write(f"{text}\n")


def _holdings(words: tuple[str, ...]) -> tuple[list[Holding], dict[str, list[Holding]]]:
    common: list[Holding] = []
    own: dict[str, list[Holding]] = {}
    for word in words:
        names, _, count = word.rpartition("=")
        fields = names.split(":")
        if len(fields) not in (2, 3) or not count.isdecimal():
            raise RequestError(
                "--holding", word, "[STRATEGY:]TYPE:ITEM=N", "for example N:engine=6 or exchange:N:LPT=3"
            )
        row = Holding(engine_type=fields[-2], module=fields[-1], count=int(count))
        (own.setdefault(fields[0], []) if len(fields) == 3 else common).append(row)
    return common, own


def ask(asked: Mapping[str, Any]) -> Answered:
    """Run the comparison; the first Ctrl-C stops it and keeps what is done."""
    request = request_of(asked)
    stop = threading.Event()

    def interrupt(number: int, frame: FrameType | None) -> None:
        del number, frame
        if stop.is_set():
            raise KeyboardInterrupt
        stop.set()
        sys.stderr.write("\nstopping; finished runs are kept\n")

    progress = Progress(per_run=max(1, len(request.strategies) or 3))

    def look_at(runs: int, verdict: Verdict) -> None:
        if verdict.pairs:
            (a, b), one = next(iter(verdict.pairs.items()))
            progress.note(f"after {runs}: {a} less {b} {one.mean / 1e6:+.1f} ± {one.half_width / 1e6:.1f} M USD")

    previous = (
        signal.signal(signal.SIGINT, interrupt) if threading.current_thread() is threading.main_thread() else None
    )
    try:
        return compare(
            Path(asked["fleet"]),
            request,
            where=where_from(asked["workers"], asked["cluster"]),
            saving=not asked["no_save"],
            progress=progress,
            cancelled=stop.is_set,
            notice=_tell,
            look_at=look_at,
        )
    finally:
        progress.close()
        if previous is not None:
            signal.signal(signal.SIGINT, previous)
