"""How often and for how long aircraft lack an engine of the fleet's own, read from a run's events. numpy only.

Two measures: *waiting* (an aircraft stands because a position is empty), and *without own* (it stands, or flies
an engine leased in meanwhile). Own spares suffice while nobody is without own; that is what a formula's cover
speaks of.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sim.events import KIND, Log
from sim.fleet import Fleet

Floats = NDArray[np.float64]
_DOWN, _START, _END, _REMOVAL = (KIND[name] for name in ("down", "lease_start", "lease_end", "removal"))
NO_ENGINE = "no engine"
LEASED = "lease/"  # serials of engines that a run leases in begin with this


class Lacks(NamedTuple):
    """By type: spans (from, to) in which one aircraft waits, and in which one position has no engine of its own."""

    waiting: dict[str, list[tuple[float, float]]]
    without_own: dict[str, list[tuple[float, float]]]


def lacks(fleet: Fleet, log: Log, *, end: float) -> Lacks:
    """Return the spans of a run in which engines lacked, by type."""
    kind_of = {row.tail: row.engine_type for row in fleet.aircraft}
    waiting: dict[str, list[tuple[float, float]]] = {t.engine_type: [] for t in fleet.engine_types}
    without: dict[str, list[tuple[float, float]]] = {t.engine_type: [] for t in fleet.engine_types}
    on_hire: dict[str, tuple[str, float]] = {}
    for row in log.rows:
        kind = row[0]
        if kind == _DOWN and row[8] == NO_ENGINE:
            waiting[kind_of[row[6]]].append((row[1], row[2]))
            without[kind_of[row[6]]].append((row[1], row[2]))
        elif kind == _START:
            on_hire[row[6]] = (kind_of[row[7]], row[1])
        elif kind == _END and row[6] in on_hire and row[4] < 0:
            engine_type, since = on_hire.pop(row[6])
            without[engine_type].append((since, row[1]))
    for engine_type, since in on_hire.values():
        without[engine_type].append((since, end))
    return Lacks(waiting, without)


def covered_share(spans: list[tuple[float, float]], edges: Floats) -> Floats:
    """Return the share of each stretch between edges that at least one span covers."""
    covered = np.zeros(edges.size - 1)
    last = float(edges[0])
    for start, stop in sorted(spans):
        low, last_before = max(start, last), last
        last = max(last_before, stop)
        if stop > low:
            covered += np.clip(np.minimum(edges[1:], stop) - np.maximum(edges[:-1], low), 0.0, None)
    return covered / np.diff(edges)


def mean_number(spans: list[tuple[float, float]], edges: Floats) -> Floats:
    """Return how many spans there are on average in each stretch between edges."""
    total = np.zeros(edges.size - 1)
    for start, stop in spans:
        total += np.clip(np.minimum(edges[1:], stop) - np.maximum(edges[:-1], start), 0.0, None)
    return total / np.diff(edges)


def removals_by_stretch(fleet: Fleet, log: Log, edges: Floats) -> dict[str, Floats]:
    """Return how many of the fleet's own engines came off in each stretch, by type."""
    kind_of = {row.engine_serial: row.engine_type for row in fleet.engines}
    days: dict[str, list[float]] = {t.engine_type: [] for t in fleet.engine_types}
    for row in log.rows:
        if row[0] == _REMOVAL and row[6] in kind_of:
            days[kind_of[row[6]]].append(row[1])
    return {name: np.histogram(found, bins=edges)[0].astype(np.float64) for name, found in days.items()}
