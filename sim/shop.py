"""Capacity in closed form: shop slots, bays and teams, first come first served.

Whoever arrives learns the start at once: slots come on a regular grid and an unused one is lost; bays (and team jobs)
are free when the earlier job ends. So a stay is one timeout and no queue needs a process.
"""

from __future__ import annotations

import heapq
import math

from sim.pricing import DAYS_PER_MONTH


class Slots:
    """Inductions at a regular grid of days; each slot serves one, an unused slot is lost."""

    __slots__ = ("_interval", "_next")

    def __init__(self, per_month: float) -> None:
        self._interval = DAYS_PER_MONTH / per_month
        self._next = 0

    def start(self, arrival: float, stay: float) -> float:
        """Take the first free slot not before ``arrival``; return its day."""
        del stay  # a slot is an induction; how long the work takes does not matter to the next
        number = max(self._next, math.ceil(arrival / self._interval - 1e-9))
        self._next = number + 1
        return max(arrival, number * self._interval)

    def expected_start(self, arrival: float, mean_stay: float) -> float:
        """Return what a planner who calls now would be told."""
        del mean_stay
        return max(arrival, max(self._next, math.ceil(arrival / self._interval - 1e-9)) * self._interval)


class Bays:
    """So many jobs at a time, first come first served."""

    __slots__ = ("_busy", "count")

    def __init__(self, count: int) -> None:
        self.count = count
        self._busy: list[float] = []

    def start(self, arrival: float, stay: float) -> float:
        """Take a bay from the first moment one is free; return that day."""
        busy = self._busy
        start = arrival if len(busy) < self.count else max(arrival, heapq.heappop(busy))
        heapq.heappush(busy, start + stay)
        return start

    def expected_start(self, arrival: float, mean_stay: float) -> float:
        """Return the expected start without looking at the ends that are drawn: a bay known to be free starts at once,
        else one mean stay is shared by the bays that are busy."""
        busy = sum(1 for end in self._busy if end > arrival)
        return arrival if busy < self.count else arrival + mean_stay / self.count


class Open:
    """No bound on capacity."""

    __slots__ = ()

    def start(self, arrival: float, stay: float) -> float:
        del stay
        return arrival

    def expected_start(self, arrival: float, mean_stay: float) -> float:
        del mean_stay
        return arrival


Capacity = Slots | Bays | Open


def capacity(per_month: float | None, bays: int | None) -> Capacity:
    """Return what bounds the work: bays where given, else slots a month, else nothing."""
    if bays is not None:
        return Bays(bays)
    return Slots(per_month) if per_month is not None else Open()
