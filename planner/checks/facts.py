"""What several rules ask of the same records, worked out once."""

from __future__ import annotations

import datetime as dt
from collections.abc import Iterable
from functools import cached_property
from typing import Any, NamedTuple

from planner.part_life import PartLife, flown_by_part, history_by_part
from planner.records import Records
from planner.settings import as_of
from sim import life
from sim.fleet import PartLimit


class EngineFact(NamedTuple):
    row: int
    engine_type: str
    place: str
    tail: str
    position: int | None
    owner: str
    cycles_since_build: int


class ModuleFact(NamedTuple):
    row: int
    engine_type: str
    module: str
    engine_serial: str
    place: str
    standard: str
    owner: str


class TailFact(NamedTuple):
    row: int
    engine_type: str
    rating: str
    positions: int
    etops_minutes: int
    owner: str
    present: bool


class NumberFact(NamedTuple):
    row: int
    engine_type: str
    module: str
    rule: str


class PartFact(NamedTuple):
    """A part with the rating it flies at (off a tail: the rating of its type with the most thrust), its limit in force
    there and what is left; ``over`` by how many cycles it is past the limit, zero when it is not."""

    row: int
    serial: str
    number: str
    module_serial: str
    life: PartLife
    cycles: int
    rating: str
    limit: PartLimit | None
    left: int
    over: int


class Stretch(NamedTuple):
    """One stretch of a part's history."""

    first: dt.date
    last: dt.date
    row: int
    cycles: int
    hours: float


class Facts:
    """Records with indexes. Cells that could not be read are None in the records and are left out here."""

    def __init__(self, records: Records) -> None:
        self.records = records
        self.as_of: dt.date = as_of(dict(records.settings))

    def setting(self, name: str) -> Any:
        return self.records.settings[name]

    def told(self, table: str) -> bool:
        """Return whether a table can be looked up in: its absence or damage is told by another rule."""
        return self.records.given(table) and table not in self.records.unreadable

    @cached_property
    def engines(self) -> dict[str, EngineFact]:
        names = ("engine_serial", "engine_type", "place", "tail", "position", "owner", "cycles_since_build")
        return {r[1]: EngineFact(r[0], *r[2:]) for r in self.records["engines"].pick(*names) if r[1]}

    @cached_property
    def modules(self) -> dict[str, ModuleFact]:
        names = ("module_serial", "engine_type", "module", "engine_serial", "place", "standard", "owner")
        return {r[1]: ModuleFact(r[0], *r[2:]) for r in self.records["modules"].pick(*names) if r[1]}

    @cached_property
    def modules_of(self) -> dict[str, list[str]]:
        """Module serials by engine serial."""
        found: dict[str, list[str]] = {}
        for serial, module in self.modules.items():
            if module.engine_serial:
                found.setdefault(module.engine_serial, []).append(serial)
        return found

    @cached_property
    def tails(self) -> dict[str, TailFact]:
        names = ("tail", "engine_type", "rating", "positions", "etops_minutes", "owner", "entry_date", "exit_date")
        found: dict[str, TailFact] = {}
        for row, tail, kind, rating, positions, etops, owner, entry, leaving in self.records["aircraft"].pick(*names):
            present = not (entry and entry > self.as_of) and not (leaving and leaving <= self.as_of)
            if tail:
                found[tail] = TailFact(row, kind, rating, positions, etops, owner, present)
        return found

    @cached_property
    def numbers(self) -> dict[str, NumberFact]:
        names = ("part_number", "engine_type", "module", "counting_rule")
        return {r[1]: NumberFact(r[0], *r[2:]) for r in self.records["part_types"].pick(*names) if r[1]}

    @cached_property
    def thrusts(self) -> dict[str, dict[str, float]]:
        """Thrust by rating by type."""
        found: dict[str, dict[str, float]] = {}
        for _, kind, rating, thrust in self.records["ratings"].pick("engine_type", "rating", "thrust_kN"):
            if kind and rating:
                found.setdefault(kind, {})[rating] = thrust or 0.0
        return found

    @cached_property
    def module_names(self) -> dict[str, list[str]]:
        """Module names by type, in the table's order."""
        found: dict[str, list[str]] = {}
        for _, kind, module in self.records["module_types"].pick("engine_type", "module"):
            if kind and module:
                found.setdefault(kind, []).append(module)
        return found

    def day(self, date: dt.date | None) -> float | None:
        return None if date is None else float((date - self.as_of).days)

    @cached_property
    def limit_rows(self) -> list[tuple[int, PartLimit]]:
        """Every readable limit with its spreadsheet row."""
        names = (
            "part_number",
            "rating",
            "limit_cycles",
            "limit_hours",
            "limit_days",
            "valid_from",
            "serial_prefix",
            "serial_from",
            "serial_to",
            "directive",
            "source",
        )
        faulty = {row for row, _ in self.records["part_limits"].faulty}
        return [
            (
                r[0],
                PartLimit(
                    **dict(zip(names[:5], r[1:6], strict=True)),
                    valid_from_day=self.day(r[6]),
                    **dict(zip(names[6:], r[7:], strict=True)),
                ),
            )
            for r in self.records["part_limits"].pick(*names)
            if r[0] not in faulty and r[1] is not None and r[3] is not None
        ]

    @cached_property
    def limits(self) -> dict[str, tuple[PartLimit, ...]]:
        found: dict[str, list[PartLimit]] = {}
        for _, row in self.limit_rows:
            found.setdefault(row.part_number, []).append(row)
        return {number: tuple(rows) for number, rows in found.items()}

    @cached_property
    def _ranged(self) -> set[str]:
        return {row.part_number for _, row in self.limit_rows if row.serial_prefix or row.serial_from or row.serial_to}

    def limits_of(self, serial: str, number: str) -> tuple[PartLimit, ...]:
        """Return the rows that hold for one serial."""
        rows = self.limits.get(number, ())
        return life.rows_for(serial, rows) if number in self._ranged else rows

    @cached_property
    def stretches(self) -> dict[str, list[Stretch]]:
        """The readable stretches of each part's history in order of their first day."""
        found: dict[str, list[Stretch]] = {}
        rows = self.records["part_history"]
        bad = {row for row, _ in rows.faulty}
        for row, serial, first, last, cycles, hours in rows.pick(
            "part_serial", "from_date", "to_date", "cycles", "hours"
        ):
            if serial and first and row not in bad:
                found.setdefault(serial, []).append(Stretch(first, last or self.as_of, row, cycles, hours))
        for stretches in found.values():
            stretches.sort()
        return found

    @cached_property
    def lives(self) -> list[PartLife]:
        return flown_by_part(self.records, self.history)

    @cached_property
    def history(self) -> dict[str, dict[str, int]]:
        """Cycles by rating for each part serial, as its history has them."""
        return history_by_part(self.records)

    def rating_of(self, module_serial: str, engine_type: str) -> str:
        """Return the rating at which a module flies; off a tail the one with the most thrust."""
        module = self.modules.get(module_serial)
        engine = self.engines.get(module.engine_serial) if module else None
        tail = self.tails.get(engine.tail) if engine else None
        if tail and tail.rating:
            return tail.rating
        thrusts = self.thrusts.get(engine_type, {})
        return max(thrusts, key=lambda rating: (thrusts[rating], rating), default="")

    @cached_property
    def parts(self) -> list[PartFact]:
        """Every readable part with what it has left today."""
        found: list[PartFact] = []
        held: dict[tuple[str, str], PartLimit | None] = {}
        names = ("part_serial", "part_number", "module_serial", "cycles_since_new")
        for (row, serial, number, module_serial, cycles), proven in zip(
            self.records["parts"].pick(*names), self.lives, strict=True
        ):
            kind = self.numbers.get(number)
            if not serial or kind is None:
                continue
            rating = self.rating_of(module_serial, kind.engine_type)
            rows = self.limits_of(serial, number)
            if number in self._ranged:
                limit = life.in_force(rows, rating, 0.0)
            else:
                if (number, rating) not in held:
                    held[number, rating] = life.in_force(rows, rating, 0.0)
                limit = held[number, rating]
            left, over = self._left(proven, rating, rows, kind.rule, limit)
            found.append(
                PartFact(row, serial, number, module_serial or "", proven, cycles or 0, rating, limit, left, over)
            )
        return found

    def _left(
        self, proven: PartLife, rating: str, rows: tuple[PartLimit, ...], rule: str, limit: PartLimit | None
    ) -> tuple[int, int]:
        """Return cycles left at a rating and cycles past the limit."""
        if len(proven.flown) <= 1 and (not proven.flown or proven.flown[0][0] == rating):
            # one rating: plain subtraction, the same by both rules
            if limit is None:
                return 0, 0
            left = limit.limit_cycles - sum(cycles for _, cycles in proven.flown)
            return (max(0, left) if proven.known else 0), max(0, -left)
        left = life.cycles_left(proven.flown, rating, rows, rule=rule, day=0.0, known=proven.known)
        if left:
            return left, 0
        return 0, past_limit(proven.flown, rating, rows, rule=rule)


def past_limit(flown: Iterable[tuple[str, int]], rating: str, rows: tuple[PartLimit, ...], *, rule: str) -> int:
    """Return by how many cycles at a rating a life is past its limit today; zero when it is not or none is known."""
    counts = tuple(flown)
    limit = life.in_force(rows, rating, 0.0)
    if limit is None:
        return 0
    if rule == "most_restrictive":
        held = [life.in_force(rows, flown_rating, 0.0) for flown_rating, cycles in counts if cycles]
        least = min([limit.limit_cycles, *(row.limit_cycles for row in held if row)])
        return max(0, sum(cycles for _, cycles in counts) - least)
    used = life.used_fraction(counts, rows, day=0.0)
    return 0 if used is None or used <= 1 else -int(-(used - 1) * limit.limit_cycles // 1)
