"""The rows that a run leaves: one tuple an event, physical only, never money.

Kinds and what their fields hold (METHOD.md lists them). ``item`` numbers the catalogue of sim/pricing.py, or is -1
for a plain fact; ``amount`` counts that item. ``until`` is later than ``day`` where the amount is spread over a span.
``booked`` is the day that decides whether the row falls inside a horizon (a visit is booked at its induction).
"""

from __future__ import annotations

from typing import NamedTuple

KINDS = (
    "install",
    "removal",
    "flown",
    "induction",
    "release",
    "module_off",
    "module_on",
    "module_induction",
    "module_release",
    "part_off",
    "part_on",
    "work",
    "cost",
    "down",
    "shortage",
    "lease_sought",
    "lease_start",
    "lease_end",
    "keeping",
    "wash",
    "rating_change",
    "directive",
    "return",
    "entry",
    "exit",
    "pool",
    "value",
    "decision",
    "robbed",
    "use",
)
KIND = {name: i for i, name in enumerate(KINDS)}


class Event(NamedTuple):
    """One row; ``kind`` is a number in KINDS, days count from the as-of date."""

    kind: int
    day: float
    until: float
    booked: float
    item: int
    amount: float
    subject: str
    other: str
    detail: str
    cycles: int
    hours: float


class Log:
    """Rows of one run, in the order in which they came about."""

    __slots__ = ("rows",)

    def __init__(self) -> None:
        self.rows: list[tuple[int, float, float, float, int, float, str, str, str, int, float]] = []

    def fact(
        self,
        kind: int,
        day: float,
        subject: str,
        other: str = "",
        detail: str = "",
        cycles: int = 0,
        hours: float = 0.0,
    ) -> None:
        """Write a row that costs nothing."""
        self.rows.append((kind, day, day, day, -1, 0.0, subject, other, detail, cycles, hours))

    def cost(
        self,
        day: float,
        item: int,
        amount: float,
        subject: str,
        detail: str = "",
        booked: float | None = None,
        other: str = "",
    ) -> None:
        """Write a row that the ledger prices on one day; ``other`` is the engine whose visit it belongs to."""
        self.rows.append(
            (_COST, day, day, day if booked is None else booked, item, amount, subject, other, detail, 0, 0.0)
        )

    def span(
        self,
        kind: int,
        day: float,
        until: float,
        item: int,
        amount: float,
        subject: str,
        other: str = "",
        detail: str = "",
        cycles: int = 0,
        hours: float = 0.0,
    ) -> None:
        """Write a row whose amount is spread evenly from ``day`` to ``until``."""
        self.rows.append((kind, day, until, day, item, amount, subject, other, detail, cycles, hours))


_COST = KIND["cost"]
