"""Which aircraft there are: sub-fleets in proportion, with entry dates, ratings and use.

Everything about a tail follows from its sub-fleet and its number in it, never from how many there are: a larger fleet
holds the smaller one, tail by tail and serial by serial.
"""

from __future__ import annotations

import datetime as dt
from typing import NamedTuple

from planner.demo.luck import spread, uniform
from sim.errors import RequestError

AS_OF = dt.date(2026, 7, 1)
MOST_AIRCRAFT = 5_000
_BLOCK = 10_000  # serial numbers kept for a sub-fleet's engines: two for each of the most aircraft
SPARES_FROM, SPARE_MODULES_FROM, JOINERS_FROM = 6 * _BLOCK, 7 * _BLOCK, 8 * _BLOCK
_FIRST_JOIN, _JOIN_EVERY_DAYS = dt.date(2028, 3, 1), 90
_AIRCRAFT_A_JOINER = 20  # two of 40


class SubFleet(NamedTuple):
    """``ratings``: how many tails of ``share`` fly at each; ``ages``: least and most years, by rating."""

    code: str
    engine_type: str
    share: int
    base: str
    ratings: tuple[tuple[str, int], ...]
    hours: float
    cycles: float
    etops: int
    derate: float
    ages: tuple[tuple[float, float], ...]


# ages are such that first planned removals of type N gather in 2027 and 2028: see the test of the bow wave
SUB_FLEETS = (
    SubFleet("NA", "N", 12, "Home", (("high", 7), ("mid", 5)), 3100, 1900, 0, 0.09, ((3.0, 3.9), (4.4, 6.4))),
    SubFleet("NB", "N", 10, "Dune", (("mid", 7), ("high", 3)), 3300, 1650, 0, 0.06, ((3.0, 4.8), (3.5, 4.5))),
    SubFleet("NC", "N", 6, "Coast", (("low", 6),), 3700, 1420, 120, 0.11, ((6.5, 9.0),)),
    SubFleet("WA", "W", 8, "Home", (("plus", 8),), 4300, 560, 180, 0.12, ((4.0, 14.0),)),
    SubFleet("WB", "W", 4, "North", (("base", 4),), 3600, 1030, 120, 0.09, ((5.0, 12.0),)),
)
_ALL = sum(sub.share for sub in SUB_FLEETS)


class Tail(NamedTuple):
    """One aircraft. ``number`` counts from 0 in its sub-fleet; ``first_engine`` is the serial number of position 1."""

    tail: str
    sub_fleet: SubFleet
    number: int
    rating: str
    entry: dt.date
    first_engine: int

    @property
    def joins_later(self) -> bool:
        return self.entry > AS_OF


def scale_of(aircraft: int) -> float:
    """Return the size against the fleet that the scenario describes."""
    return aircraft / _ALL


def tails(aircraft: int, seed: int) -> list[Tail]:
    """Return the tails of a fleet of that size today, and those that join it in 2028.

    Raises RequestError for a size out of range.
    """
    if not 1 <= aircraft <= MOST_AIRCRAFT:
        raise RequestError("--aircraft", str(aircraft), f"1 to {MOST_AIRCRAFT}")
    result = []
    for place, (sub, count) in enumerate(zip(SUB_FLEETS, counts(aircraft), strict=True)):
        start = uniform(seed, "ages", sub.code)
        for number in range(count):
            rating, (least, most) = _rating(sub, number)
            years = least + (most - least) * spread(number, start)
            entry = AS_OF - dt.timedelta(days=round(365.25 * years))
            first = (place + 1) * _BLOCK + 2 * number + 1
            result.append(Tail(f"{sub.code}-{number + 1:02d}", sub, number, rating, entry, first))
    return result + [_joiner(number) for number in range(aircraft // _AIRCRAFT_A_JOINER)]


def counts(aircraft: int) -> list[int]:
    """Share out so many aircraft one by one (Webster's divisors): no sub-fleet ever shrinks when the fleet grows."""
    found = [0] * len(SUB_FLEETS)
    for _ in range(aircraft):
        next_one = max(range(len(found)), key=lambda i: (SUB_FLEETS[i].share / (2 * found[i] + 1), -i))
        found[next_one] += 1
    return found


def _joiner(number: int) -> Tail:
    sub = SUB_FLEETS[0]
    entry = _FIRST_JOIN + dt.timedelta(days=_JOIN_EVERY_DAYS * (number % 4))
    return Tail(f"NX-{number + 1:02d}", sub, number, "high", entry, JOINERS_FROM + 2 * number + 1)


def _rating(sub: SubFleet, number: int) -> tuple[str, tuple[float, float]]:
    """Return the rating of a tail and its range of ages: two ratings spread evenly over the numbers, exact at the
    scenario's own size."""
    first = sub.ratings[0][1]
    place = 0 if (number + 1) * first // sub.share > number * first // sub.share else -1
    return sub.ratings[place][0], sub.ages[place]
