"""What the records prove of each part's life: cycles by rating flown, and whether they are proven at all.

A blank count, a history that falls short of it, or a status that is not substantiated make the life unknown, and
unknown life is zero. Where the history is longer than the count the history holds: use is rounded up.
"""

from __future__ import annotations

from typing import NamedTuple

from planner.records import Records


class PartLife(NamedTuple):
    """``why`` says in words why a life is unknown, and is blank where it is known; ``short`` that it is for a history
    that falls short."""

    flown: tuple[tuple[str, int], ...]
    known: bool
    why: str
    short: bool = False


def lowest_ratings(records: Records) -> dict[str, str]:
    """Return for each part number the rating at which its lowest general limit stands."""
    lowest: dict[str, tuple[int, str]] = {}
    limits = records["part_limits"]
    for _, number, rating, cycles, directive in limits.pick("part_number", "rating", "limit_cycles", "directive"):
        if directive or number is None or rating is None or cycles is None:
            continue
        if number not in lowest or (cycles, rating) < lowest[number]:
            lowest[number] = (cycles, rating)
    return {number: rating for number, (_, rating) in lowest.items()}


def history_by_part(records: Records) -> dict[str, dict[str, int]]:
    """Return cycles by rating for each part serial, as its history has them."""
    totals: dict[str, dict[str, int]] = {}
    for _, serial, rating, cycles in records["part_history"].pick("part_serial", "rating", "cycles"):
        if serial is None or rating is None or cycles is None:
            continue
        by_rating = totals.setdefault(serial, {})
        by_rating[rating] = by_rating.get(rating, 0) + cycles
    return totals


def _clocks(records: Records) -> tuple[set[str], set[str]]:
    """Return the part numbers that have a limit in hours, and those that have one in days."""
    rows = list(records["part_limits"].pick("part_number", "limit_hours", "limit_days"))
    return {number for _, number, hours, _ in rows if hours}, {number for _, number, _, days in rows if days}


def flown_by_part(records: Records, history: dict[str, dict[str, int]] | None = None) -> list[PartLife]:
    """Return the life of each row of ``parts``, in their order; ``history`` where it is known already."""
    if history is None:
        history = history_by_part(records)
    lowest = lowest_ratings(records)
    with_history = records.given("part_history")
    in_hours, in_days = _clocks(records)
    lives = []
    names = ("part_serial", "part_number", "cycles_since_new", "hours_since_new", "made_date", "status_substantiated")
    for _, serial, number, cycles, hours, made, substantiated in records["parts"].pick(*names):
        flown = dict(history.get(serial, {}))
        short = (cycles or 0) - sum(flown.values())
        if short > 0:
            # where they were flown is not known: at the rating that leaves least
            rating = lowest.get(number, "")
            flown[rating] = flown.get(rating, 0) + short
        why = ""
        if cycles is None:
            why = "cycles since new are blank"
        elif short > 0 and with_history:
            why = f"history is {short:,} cycles short"
        elif hours is None and number in in_hours:
            why = "hours since new are blank and its limit counts hours"
        elif made is None and number in in_days:
            why = "the day of manufacture is blank and its limit counts days"
        elif not substantiated:
            why = "status is not substantiated"
        lives.append(PartLife(tuple(flown.items()), not why, why, why.startswith("history")))
    return lives
