"""Life that is left, in exact arithmetic: fractions until the final rounding down.

Fraction used ``u = sum_r C_r / L_r``; cycles left at rating j ``floor((1 - u) L_j)``. Parts under the most restrictive
rule: ``min(L at the ratings flown and at the one to be flown) - sum C_r``. Both are common practice, no source; a
setting of the part number. Floating point would turn a worked 7,100 into 7,099. Unknown life is zero life.
"""

from __future__ import annotations

import math
import re
from collections.abc import Iterable
from dataclasses import replace
from fractions import Fraction

from sim.fleet import PartLimit

_SERIAL = re.compile(r"^(.*?)(\d+)$")


def holds_for(row: PartLimit, serial: str) -> bool:
    """Return whether a row of limits covers a serial: its prefix, and its number within the range."""
    if not row.serial_prefix and row.serial_from is None and row.serial_to is None:
        return True
    match = _SERIAL.match(serial)
    if match is None or (row.serial_prefix and match.group(1) != row.serial_prefix):
        return False
    number = int(match.group(2))
    return (row.serial_from is None or number >= row.serial_from) and (row.serial_to is None or number <= row.serial_to)


def rows_for(serial: str, limits: tuple[PartLimit, ...]) -> tuple[PartLimit, ...]:
    """Return the rows of one part number that cover a serial (general rows cover all)."""
    return tuple(row for row in limits if holds_for(row, serial))


def in_force(rows: tuple[PartLimit, ...], rating: str, day: float) -> PartLimit | None:
    """Return the row that limits at a rating on a day: the latest general row (on equal dates the lower), capped by
    every directive row whose date has come, in cycles, hours and days alike. None when nothing is published."""
    held = [r for r in rows if r.rating == rating and (r.valid_from_day is None or r.valid_from_day <= day)]
    best: PartLimit | None = None
    for row in held:
        if row.directive:
            continue
        if best is None or (_day(row), -row.limit_cycles) > (_day(best), -best.limit_cycles):
            best = row
    caps = [row for row in held if row.directive]
    if best is None or not caps:
        return best
    lowest = min((best, *caps), key=lambda row: row.limit_cycles)
    hours = min((row.limit_hours for row in (best, *caps) if row.limit_hours is not None), default=None)
    days = min((row.limit_days for row in (best, *caps) if row.limit_days is not None), default=None)
    # a directive that says nothing of hours or days leaves those limits as they were
    return replace(lowest, limit_hours=hours, limit_days=days)


def _day(row: PartLimit) -> float:
    return -math.inf if row.valid_from_day is None else row.valid_from_day


def change_days(rows: tuple[PartLimit, ...]) -> tuple[float, ...]:
    """Return the days on which a row comes into force, in order."""
    return tuple(sorted({row.valid_from_day for row in rows if row.valid_from_day is not None}))


def used_fraction(flown: Iterable[tuple[str, int]], rows: tuple[PartLimit, ...], *, day: float) -> Fraction | None:
    """Return the exact fraction of life used by the linear rule; None when a rating flown has no limit."""
    used = Fraction(0)
    for rating, cycles in flown:
        if not cycles:
            continue
        row = in_force(rows, rating, day)
        if row is None:
            return None
        used += Fraction(cycles, row.limit_cycles)
    return used


def cycles_left(
    flown: Iterable[tuple[str, int]],
    rating: str,
    rows: tuple[PartLimit, ...],
    *,
    rule: str,
    day: float,
    known: bool = True,
) -> int:
    """Return cycles left at a rating, rounded down, never below zero; zero when life is unknown or a limit is missing.

    ``rule`` is ``linear`` or ``most_restrictive``.
    """
    counts = tuple(flown)
    row = in_force(rows, rating, day)
    if not known or row is None:
        return 0
    if rule == "most_restrictive":
        limits = [row.limit_cycles]
        for flown_rating, cycles in counts:
            held = in_force(rows, flown_rating, day)
            if cycles and held is None:
                return 0
            if cycles and held is not None:
                limits.append(held.limit_cycles)
        return max(0, min(limits) - sum(cycles for _, cycles in counts))
    used = used_fraction(counts, rows, day=day)
    return 0 if used is None else max(0, math.floor((1 - used) * row.limit_cycles))
