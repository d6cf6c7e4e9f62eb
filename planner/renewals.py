"""Removals month by month: the first of every position, then runs that follow one another.

The renewal equation ``m = f + m * g`` forward in time: what ends in a month starts a run whose law is counted
from there. Runs that follow are those after the visit foreseen for the position's engine, mixed by how often a
module is exchanged instead; the first of all are those of the spares that stand ready today, until they are used
up.
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from planner.causes_ahead import PLANNED, Ahead, FirstRemoval, Months, first_removal, gathered
from planner.next_runs import Run

Floats = NDArray[np.float64]
NO_DEMAND = ("return", "exit")  # the engine leaves with its tail: nobody asks for a spare


class Position(NamedTuple):
    """One position: what is ahead of its engine, and the runs after it: built whole, and with one module
    exchanged."""

    tail: str
    position: int
    engine_serial: str
    ahead: Ahead
    whole: Run | None
    exchanged: Run | None


class Renewing(NamedTuple):
    """The slots whose repair starts a new run, when the engine goes whole and when a module is exchanged."""

    whole: frozenset[int]
    exchanged: frozenset[int]


def removal_rates(
    positions: Sequence[Position],
    spares: Sequence[Ahead],
    months: Months,
    *,
    slots: int,
    renewing: Renewing,
    exchanged_frac: float,
) -> Floats:
    """Return expected removals of each position by month, slot (the last: whole engine) and kind (planned, chance).

    ``spares``: what is ahead of each spare that stands ready. ``exchanged_frac``: share of removals that find a
    module on the shelf. Shape of the result: (positions, months, slots + 1, 2).
    """
    count = len(months)
    if not positions:
        return np.zeros((0, count, slots + 1, 2))
    keep = renewing.whole if exchanged_frac == 0.0 else renewing.whole | renewing.exchanged
    first = [_one_run(one.ahead, months, slots, keep) for one in positions]
    after = [_after(one, months, slots, renewing, exchanged_frac) for one in positions]
    ready = [_one_run(one, months, slots, keep) for one in spares] or [_never(count, slots)]
    every, ends = np.array([one.counts for one in first]), np.array([one.ends for one in first])
    later_counts, later_ends = np.array([one.counts for one in after]), np.array([one.ends for one in after])
    spare_counts = np.mean([one.counts for one in ready], axis=0)
    spare_ends = np.mean([one.ends for one in ready], axis=0)
    unused = float(len(spares))
    for month in range(count - 1):
        ending, rest = ends[:, month], count - month - 1
        total = float(ending.sum())
        share = min(1.0, unused / total) if total > 0.0 else 0.0
        unused = max(0.0, unused - total)
        counts = share * spare_counts[None, :rest] + (1.0 - share) * later_counts[:, :rest]
        every[:, month + 1 :] += ending[:, None, None, None] * counts
        chance = share * spare_ends[None, :rest] + (1.0 - share) * later_ends[:, :rest]
        ends[:, month + 1 :] += ending[:, None] * chance
    operating = np.array([_operating(one, months.edges) for one in positions])
    return np.asarray(every * operating[:, :, None, None])


def _after(one: Position, months: Months, slots: int, renewing: Renewing, exchanged_frac: float) -> _RunLaw:
    """Return the law of the run after a removal, mixed over the ways out."""
    whole = _one_run(one.whole.after, months, slots, renewing.whole) if one.whole else _never(len(months), slots)
    if exchanged_frac == 0.0 or one.exchanged is None:
        return whole
    other = _one_run(one.exchanged.after, months, slots, renewing.exchanged)
    return _RunLaw(
        (1.0 - exchanged_frac) * whole.counts + exchanged_frac * other.counts,
        (1.0 - exchanged_frac) * whole.ends + exchanged_frac * other.ends,
    )


class _RunLaw(NamedTuple):
    """One run by month: removals by slot and kind, shape (months, slots + 1, 2), and the chance that it ends then."""

    counts: Floats
    ends: Floats


def _never(months: int, slots: int) -> _RunLaw:
    return _RunLaw(np.zeros((months, slots + 1, 2)), np.zeros(months))


def _one_run(one: Ahead, months: Months, slots: int, renewing: frozenset[int]) -> _RunLaw:
    """Return a run's law.

    A chance cause whose repair leaves the rest of the engine as it was does not end the run: it comes again and again
    while the run lasts, and the planned cause comes when it would have come (minimal repair; Barlow and Hunter,
    *Operations Research* 8, 1960).
    """
    law = first_removal(one._replace(chances=tuple(c for c in one.chances if c.slot in renewing)), months)
    counts, ends = _split(law, len(months), slots), law.by_month.sum(axis=1)
    cycles, hours = months.flown_until(one.use, one.planned_day)
    # on at the month's start, and at its end (or just before the planned day, where that cuts the month short)
    start = np.concatenate([[1.0], law.still_on[:-1]])
    end = np.where(months.edges[1:] > one.planned_day, start, law.still_on)
    for chance in one.chances:
        if chance.slot not in renewing:
            counts[:, chance.slot, 1] += (start + end) / 2.0 * np.diff(gathered(chance, cycles, hours))
    return _RunLaw(counts, ends)


def _split(law: FirstRemoval, months: int, slots: int) -> Floats:
    """Return a first-removal law by month, slot (the last: whole engine) and kind (planned, chance)."""
    found = np.zeros((months, slots + 1, 2))
    for column, (cause, slot) in enumerate(law.causes):
        if cause not in NO_DEMAND:
            found[:, slot if slot >= 0 else slots, 0 if cause in PLANNED else 1] += law.by_month[:, column]
    return found


def _operating(position: Position, edges: Floats) -> Floats:
    """Return the share of each month in which the tail flies: it may enter later, and leave."""
    end = min((p.day for p in position.ahead.planned if p.cause in NO_DEMAND), default=math.inf)
    return overlap(edges, position.ahead.use.since, end)


def overlap(edges: Floats, start: float, end: float) -> Floats:
    """Return the share of each month that lies between two days."""
    inside = np.minimum(edges[1:], end) - np.maximum(edges[:-1], start)
    return np.asarray(np.clip(inside / np.diff(edges), 0.0, 1.0))
