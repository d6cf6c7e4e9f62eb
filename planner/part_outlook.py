"""One part ahead: what it has left on a day and the day on which it must be off, at planned use."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import replace
from typing import NamedTuple

from planner.planned_use import PlannedUse
from sim import life
from sim.fleet import Part, PartLimit


class Left(NamedTuple):
    """What a part has left at a rating on a day. ``limit`` is None where none is published there; ``hours`` and
    ``days`` are None where the limit does not count them; ``used_frac`` is 1 where the life is not known."""

    rating: str
    limit: PartLimit | None
    cycles: int
    used_cycles: int
    used_frac: float
    hours: float | None
    days: float | None

    @property
    def left_frac(self) -> float:
        """Return the fraction of life left, the least over cycles, hours and days."""
        if self.limit is None or not self.limit.limit_cycles:
            return 0.0
        fractions = [self.cycles / self.limit.limit_cycles]
        if self.hours is not None and self.limit.limit_hours:
            fractions.append(self.hours / self.limit.limit_hours)
        if self.days is not None and self.limit.limit_days:
            fractions.append(self.days / self.limit.limit_days)
        return max(0.0, min(1.0, *fractions))


def left_at(part: Part, rating: str, rows: tuple[PartLimit, ...], *, rule: str, day: float) -> Left:
    """Return what a part has left at a rating on a day; unknown life is none."""
    limit = life.in_force(rows, rating, day)
    known = part.life_known
    cycles = life.cycles_left(part.flown, rating, rows, rule=rule, day=day, known=known)
    used_cycles = sum(count for _, count in part.flown)
    hours = days = None
    if limit is not None and limit.limit_hours is not None:
        hours = (
            max(0.0, limit.limit_hours - part.hours_since_new) if known and part.hours_since_new is not None else 0.0
        )
    if limit is not None and limit.limit_days is not None:
        days = max(0.0, part.made_day + limit.limit_days - day) if known and part.made_day is not None else 0.0
    if hours == 0.0 or days == 0.0:
        cycles = 0
    return Left(rating, limit, cycles, used_cycles, _used(part, limit, rows, rule, day), hours, days)


def _used(part: Part, limit: PartLimit | None, rows: tuple[PartLimit, ...], rule: str, day: float) -> float:
    if not part.life_known or limit is None:
        return 1.0
    if rule == "most_restrictive":
        held = [life.in_force(rows, rating, day) for rating, count in part.flown if count]
        least = min([limit.limit_cycles, *(row.limit_cycles for row in held if row is not None)])
        return 1.0 if None in held else sum(count for _, count in part.flown) / least
    used = life.used_fraction(part.flown, rows, day=day)
    return 1.0 if used is None else float(used)


def least_left(part: Part, ratings: Iterable[str], rows: tuple[PartLimit, ...], *, rule: str, day: float) -> Left:
    """Return what a part off every tail has left: the least over its type's ratings, named."""
    found = [left_at(part, rating, rows, rule=rule, day=day) for rating in ratings]
    return min(found, key=lambda left: (left.cycles, left.rating))


def flown_to(part: Part, use: PlannedUse, day: float, *, since: float = 0.0) -> Part:
    """Return a part as it will be after flying with a tail as planned from day ``since`` until a day."""
    flown = dict(part.flown)
    if day <= since:
        return part
    starts = [since, *(stretch.day for stretch in use.stretches if since < stretch.day < day)]
    for start, end in zip(starts, [*starts[1:], day], strict=True):
        cycles = use.whole_cycles(end) - use.whole_cycles(start)
        rating = use.at_day(start).rating
        flown[rating] = flown.get(rating, 0) + cycles
    hours = part.hours_since_new
    if hours is not None:
        hours += use.hours(use.whole_cycles(day)) - use.hours(use.whole_cycles(since))
    return replace(part, flown=tuple(flown.items()), hours_since_new=hours)


def must_be_off(part: Part, use: PlannedUse, rows: tuple[PartLimit, ...], *, rule: str, day: float = 0.0) -> float:
    """Return the day on which a part reaches a limit, flown as planned from ``day`` on; ``part`` is as it is then.

    Limits that change on a day, ratings that end and changes of use are passed in order. A limit that falls below what
    is flown ends the life on its day. Infinite where nothing ever limits.
    """
    starts = {day, *(d for d in life.change_days(rows) if d > day), *(s.day for s in use.stretches if s.day > day)}
    order = sorted(starts)
    flown = dict(part.flown)
    base_hours, base_cycles = part.hours_since_new, use.whole_cycles(day)
    for start, end in zip(order, [*order[1:], math.inf], strict=True):
        rating = use.at_day(start).rating
        left = life.cycles_left(flown.items(), rating, rows, rule=rule, day=start, known=part.life_known)
        if left == 0:
            return start
        first = use.whole_cycles(start)
        limit = life.in_force(rows, rating, start)
        ends = use.day(first + left) if end == math.inf or first + left <= use.whole_cycles(end) else math.inf
        if limit is not None and limit.limit_hours is not None and base_hours is not None:
            ends = min(ends, _hours_day(use, base_cycles, limit.limit_hours - base_hours))
        if limit is not None and limit.limit_days is not None and part.made_day is not None:
            ends = min(ends, part.made_day + limit.limit_days)
        if ends <= end:
            return max(start, ends)
        flown[rating] = flown.get(rating, 0) + use.whole_cycles(end) - first
    return math.inf


def _hours_day(use: PlannedUse, base_cycles: int, hours: float) -> float:
    """Return the day on which so many hours are flown after ``base_cycles``."""
    if hours <= 0:
        return 0.0
    target = use.hours(base_cycles) + hours
    low, high = float(base_cycles), float(base_cycles + 1)
    while use.hours(high) < target and high < 1e9:
        low, high = high, 2 * high
    for _ in range(60):
        middle = (low + high) / 2
        low, high = (middle, high) if use.hours(middle) < target else (low, middle)
    return use.day(low)
