"""Which aircraft there are: sub-fleets in proportion, with entry dates, ratings and use."""

from __future__ import annotations

import datetime as dt
from typing import NamedTuple

from planner.demo.luck import between
from sim.errors import RequestError

AS_OF = dt.date(2026, 7, 1)
MOST_AIRCRAFT = 5_000
JOINING_FROM = 20  # from this size on two aircraft join in 2028, on top of those that fly today


class SubFleet(NamedTuple):
    """``ratings``: share of the tails at each rating, in order."""

    code: str
    engine_type: str
    share: int
    base: str
    ratings: tuple[tuple[str, float], ...]
    hours: float
    cycles: float
    etops: int
    derate: float
    oldest: float
    youngest: float


SUB_FLEETS = (
    SubFleet("NA", "N", 12, "Home", (("high", 7 / 12), ("mid", 5 / 12)), 3100, 1900, 0, 0.09, 9.5, 3.0),
    SubFleet("NB", "N", 10, "Dune", (("mid", 0.7), ("high", 0.3)), 3300, 1650, 0, 0.06, 9.0, 3.5),
    SubFleet("NC", "N", 6, "Coast", (("low", 1.0),), 3700, 1420, 120, 0.11, 13.5, 6.0),
    SubFleet("WA", "W", 8, "Home", (("plus", 1.0),), 4300, 560, 180, 0.12, 14.0, 4.0),
    SubFleet("WB", "W", 4, "North", (("base", 1.0),), 3600, 1030, 120, 0.09, 12.0, 5.0),
)


class Tail(NamedTuple):
    tail: str
    sub_fleet: SubFleet
    rating: str
    entry: dt.date


def tails(aircraft: int, seed: int) -> list[Tail]:
    """Return the tails of a fleet of that size. Raises RequestError for a size out of range."""
    if not 1 <= aircraft <= MOST_AIRCRAFT:
        raise RequestError("--aircraft", str(aircraft), f"1 to {MOST_AIRCRAFT}")
    result = []
    for sub, count in zip(SUB_FLEETS, _counts(aircraft), strict=True):
        for number in range(count):
            place = (number + 0.5) / count
            age = sub.youngest + (sub.oldest - sub.youngest) * (1.0 - place)
            age += between(-0.4, 0.4, seed, "age", sub.code, number)
            entry = AS_OF - dt.timedelta(days=round(365.25 * max(2.5, age)))
            result.append(Tail(f"{sub.code}-{number + 1:02d}", sub, _rating(sub, number), entry))
    if aircraft >= JOINING_FROM:
        joins = SUB_FLEETS[0]
        last = sum(t.sub_fleet is joins for t in result)
        for number, entry in enumerate((dt.date(2028, 3, 1), dt.date(2028, 6, 1))):
            result.append(Tail(f"{joins.code}-{last + number + 1:02d}", joins, "high", entry))
    return result


def _counts(aircraft: int) -> list[int]:
    """Share out so many aircraft in proportion, largest remainders first."""
    whole = sum(s.share for s in SUB_FLEETS)
    exact = [aircraft * s.share / whole for s in SUB_FLEETS]
    counts = [int(x) for x in exact]
    order = sorted(range(len(exact)), key=lambda i: (counts[i] - exact[i], i))
    for i in order[: aircraft - sum(counts)]:
        counts[i] += 1
    return counts


def _rating(sub: SubFleet, number: int) -> str:
    """Spread the ratings evenly over ages: whoever is furthest behind its share is next."""
    given = {name: 0 for name, _ in sub.ratings}
    chosen = sub.ratings[0][0]
    for place in range(number + 1):
        chosen = max(sub.ratings, key=lambda one: one[1] * (place + 1) - given[one[0]])[0]
        given[chosen] += 1
    return chosen
