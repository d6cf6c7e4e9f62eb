"""How a tail is planned to be flown from the as-of date on: cycles, hours and rating by day, and back."""

from __future__ import annotations

import math
from bisect import bisect_right
from typing import NamedTuple

from sim.fleet import Aircraft, Fleet
from sim.season import Season

_ROUND = 1e-6  # a cycle counts as flown when this little is missing, against rounding of days


class Stretch(NamedTuple):
    """One stretch of even use: first day, cycles flown before it, rating, hours and cycles a year."""

    day: float
    cycles: float
    rating: str
    hours_per_year: float
    cycles_per_year: float

    @property
    def hours_per_cycle(self) -> float:
        return self.hours_per_year / self.cycles_per_year


class PlannedUse:
    """A tail's use ahead, changes of rating and utilisation included; days count from the as-of date."""

    __slots__ = ("_season", "stretches")

    def __init__(self, fleet: Fleet, aircraft: Aircraft, *, season: Season) -> None:
        self._season = season
        hours, cycles, rating = aircraft.hours_per_year, aircraft.cycles_per_year, aircraft.rating
        changes: dict[float, dict[str, float | str]] = {0.0: {}}
        if aircraft.rating_until_day is not None and aircraft.rating_after:
            changes.setdefault(max(0.0, aircraft.rating_until_day), {})["rating"] = aircraft.rating_after
        for use in fleet.utilisation:
            if use.tail in (aircraft.tail, aircraft.sub_fleet):
                change = changes.setdefault(max(0.0, use.from_day), {})
                change["hours"], change["cycles"] = use.hours_per_year, use.cycles_per_year
        stretches: list[Stretch] = []
        for day in sorted(changes):
            flown = self._since(stretches[-1], day) if stretches else 0.0
            change = changes[day]
            rating = str(change.get("rating", rating))
            hours, cycles = float(change.get("hours", hours)), float(change.get("cycles", cycles))
            stretches.append(Stretch(day, flown, rating, hours, cycles))
        self.stretches = tuple(stretches)

    def _since(self, stretch: Stretch, day: float) -> float:
        years = self._season.flown(day) - self._season.flown(stretch.day)
        return stretch.cycles + years * stretch.cycles_per_year

    def at_day(self, day: float) -> Stretch:
        """Return the stretch that holds on a day."""
        return self.stretches[max(0, bisect_right(self.stretches, day, key=lambda one: one.day) - 1)]

    def at_cycles(self, cycles: float) -> Stretch:
        """Return the stretch in which so many cycles from now are flown."""
        return self.stretches[max(0, bisect_right(self.stretches, cycles, key=lambda one: one.cycles) - 1)]

    def cycles(self, day: float) -> float:
        """Return the cycles flown by a day if the aircraft flies all the time."""
        return self._since(self.at_day(day), day) if day > 0.0 else 0.0

    def whole_cycles(self, day: float) -> int:
        return max(0, math.floor(self.cycles(day) + _ROUND))

    def day(self, cycles: float) -> float:
        """Return the day on which so many cycles have been flown."""
        stretch = self.at_cycles(cycles)
        start = self._season.flown(stretch.day)
        return self._season.day(start + (cycles - stretch.cycles) / stretch.cycles_per_year)

    def hours(self, cycles: float) -> float:
        """Return the hours flown in the first so many cycles."""
        total = 0.0
        for stretch, after in zip(self.stretches, (*self.stretches[1:], None), strict=True):
            last = cycles if after is None else min(cycles, after.cycles)
            if last <= stretch.cycles:
                break
            total += (last - stretch.cycles) * stretch.hours_per_cycle
        return total
