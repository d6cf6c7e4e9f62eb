"""A fleet indexed for questions on life: where a part flies, at which rating, under which limits, how it is used."""

from __future__ import annotations

import datetime as dt
import math
from functools import cached_property

from planner.part_outlook import Left, flown_to, least_left, left_at, must_be_off
from planner.planned_use import PlannedUse
from sim import life
from sim.fleet import Fleet, Part, PartLimit
from sim.season import Season


class LifeIndex:
    """Built once for each question; parts are looked up by serial."""

    def __init__(self, fleet: Fleet) -> None:
        self.fleet = fleet
        self.season = Season(fleet.settings.as_of, fleet.season)
        self.aircraft = {aircraft.tail: aircraft for aircraft in fleet.aircraft}
        self.engines = {engine.engine_serial: engine for engine in fleet.engines}
        self.modules = {module.module_serial: module for module in fleet.modules}
        self.numbers = {row.part_number: row for row in fleet.part_types}
        self._uses: dict[str, PlannedUse] = {}

    @cached_property
    def _limits(self) -> dict[str, tuple[PartLimit, ...]]:
        found: dict[str, list[PartLimit]] = {}
        for row in self.fleet.part_limits:
            found.setdefault(row.part_number, []).append(row)
        return {number: tuple(rows) for number, rows in found.items()}

    @cached_property
    def _ratings(self) -> dict[str, tuple[str, ...]]:
        found: dict[str, list[str]] = {}
        for row in self.fleet.ratings:
            found.setdefault(row.engine_type, []).append(row.rating)
        return {kind: tuple(ratings) for kind, ratings in found.items()}

    def limits_of(self, part: Part) -> tuple[PartLimit, ...]:
        return life.rows_for(part.part_serial, self._limits.get(part.part_number, ()))

    def engine_of(self, part: Part) -> str:
        module = self.modules.get(part.module_serial)
        return module.engine_serial if module else ""

    def hangs_on(self, engine_serial: str) -> str:
        """Return the tail that an engine hangs on, blank for a spare or an engine in a shop."""
        engine = self.engines.get(engine_serial)
        return engine.tail if engine and engine.place in ("wing", "leased_in") and engine.tail in self.aircraft else ""

    def tail_of(self, part: Part) -> str:
        return self.hangs_on(self.engine_of(part))

    def use_of(self, tail: str) -> PlannedUse:
        if tail not in self._uses:
            self._uses[tail] = PlannedUse(self.fleet, self.aircraft[tail], season=self.season)
        return self._uses[tail]

    def left(self, part: Part, day: float) -> tuple[Part, Left]:
        """Return a part as it will be on a day and what it has left then."""
        rule, rows = self.numbers[part.part_number].counting_rule, self.limits_of(part)
        tail = self.tail_of(part)
        if not tail:
            ratings = self._ratings[self.numbers[part.part_number].engine_type]
            return part, least_left(part, ratings, rows, rule=rule, day=day)
        use = self.use_of(tail)
        then = flown_to(part, use, day, since=self._entry(tail))
        return then, left_at(then, use.at_day(day).rating, rows, rule=rule, day=day)

    def day_reached(self, part: Part, day: float) -> float:
        """Return the day on which a part, as it is on ``day``, must be off; infinite off a tail."""
        tail = self.tail_of(part)
        if not tail:
            return math.inf
        rule = self.numbers[part.part_number].counting_rule
        start = max(day, self._entry(tail))
        return must_be_off(part, self.use_of(tail), self.limits_of(part), rule=rule, day=start)

    def _entry(self, tail: str) -> float:
        """Return the day from which an aircraft flies."""
        return max(0.0, self.aircraft[tail].entry_day or 0.0)

    def date(self, day: float) -> dt.date | None:
        """Return the date of a day, None where it is never reached; a broken day is rounded down."""
        if day == math.inf:
            return None
        return self.season.date(math.floor(day)) if day >= 0 else self.fleet.settings.as_of + dt.timedelta(days=day)
