"""The question ``life``: what every life-limited part has left and why, which part limits each engine, who is hit by a
directive, and whose serials are in whose assemblies.

Dates assume that every aircraft flies as planned and that nothing is exchanged. Off a tail the least over the type's
ratings holds. Unknown life is zero and is said to be unknown.
"""

from __future__ import annotations

import datetime as dt
from collections.abc import Container
from pathlib import Path
from typing import NamedTuple

from planner.assemble import load
from planner.directives import DirectiveLife, directive_lives
from planner.fingerprint import folder
from planner.life_index import LifeIndex
from planner.part_outlook import Left
from planner.whose import Elsewhere, elsewhere
from sim.errors import RequestError
from sim.fleet import Fleet, Part

STATES = ("at limit", "near limit", "unknown", "clear")


class PartLife(NamedTuple):
    """One part; columns as in the output table ``life_parts``."""

    part_serial: str
    part_number: str
    module_serial: str
    engine_serial: str
    tail: str
    rating: str
    limit_cycles: int
    limit_source: str
    cycles_used: int
    cycles_by_rating: str
    counting_rule: str
    used_frac: float
    cycles_left: int
    hours_left: float | None
    days_left: float | None
    life_known: bool
    state: str
    date_reached: dt.date | None
    value_left_usd: float
    owner: str


class EngineLife(NamedTuple):
    """One engine; columns as in the output table ``life_engines``."""

    engine_serial: str
    tail: str
    rating: str
    cycles_left: int
    state: str
    limiting_part_serial: str
    date_reached: dt.date | None
    second_part_serial: str
    second_cycles_left: int | None
    third_part_serial: str
    third_cycles_left: int | None


class Lives(NamedTuple):
    """The answer. ``at`` is the day that it holds for."""

    parts: tuple[PartLife, ...]
    engines: tuple[EngineLife, ...]
    directives: tuple[DirectiveLife, ...]
    places: tuple[Elsewhere, ...]
    at: dt.date
    assumptions: tuple[str, ...]
    inputs: str
    demo: bool


def answer(path: Path, *, tail: str | None = None, engine: str | None = None, at: dt.date | None = None) -> Lives:
    """Return the lives of a fleet, of one tail or one engine, today or on a later day.

    Raises RecordsError where the records cannot be used, RequestError for unknown serials and days before the records.
    """
    return lives(load(path), tail=tail, engine=engine, at=at, inputs=folder(path))


def lives(
    fleet: Fleet, *, tail: str | None = None, engine: str | None = None, at: dt.date | None = None, inputs: str = ""
) -> Lives:
    """Return the lives of a fleet as ``answer`` does."""
    index = LifeIndex(fleet)
    _known("tail", tail, index.aircraft)
    _known("engine", engine, index.engines)
    as_of = fleet.settings.as_of
    day = 0.0 if at is None else float((at - as_of).days)
    if day < 0:
        raise RequestError("day", str(at), f"{as_of} or later", "the records say nothing of the days before")

    def asked(part: Part) -> bool:
        serial = index.engine_of(part)
        if engine is not None and serial != engine:
            return False
        return tail is None or index.tail_of(part) == tail

    parts = tuple(_part_life(index, part, day) for part in fleet.parts if asked(part))
    return Lives(
        parts=tuple(sorted(parts, key=lambda row: (row.cycles_left, row.part_serial))),
        engines=_engine_lives(index, parts, tail=tail, engine=engine),
        directives=tuple(row for row in directive_lives(index) if _asked(row, tail, engine)),
        places=tuple(row for row in elsewhere(fleet) if engine is None or row.flies_on == engine),
        at=as_of if at is None else at,
        assumptions=(*fleet.assumptions, "dates hold if every aircraft flies as planned and nothing is exchanged"),
        inputs=inputs,
        demo=fleet.settings.demo,
    )


def _known(what: str, serial: str | None, known: Container[str]) -> None:
    if serial is not None and serial not in known:
        raise RequestError(what, serial, f"a {what} of the fleet", "spoolwright life FLEET lists them")


def _asked(row: DirectiveLife, tail: str | None, engine: str | None) -> bool:
    return (tail is None or row.tail == tail) and (engine is None or row.engine_serial == engine)


def state_of(left: Left, *, known: bool, band_cycles: int) -> str:
    """Return the state of a life in words, one of STATES."""
    if not known or left.limit is None:
        return "unknown"
    if left.cycles == 0:
        return "at limit"
    return "near limit" if left.cycles < band_cycles else "clear"


def _part_life(index: LifeIndex, part: Part, day: float) -> PartLife:
    number = index.numbers[part.part_number]
    then, left = index.left(part, day)
    reached = index.day_reached(then, day)
    limit = left.limit
    return PartLife(
        part_serial=part.part_serial,
        part_number=part.part_number,
        module_serial=part.module_serial,
        engine_serial=index.engine_of(part),
        tail=index.tail_of(part),
        rating=left.rating,
        limit_cycles=limit.limit_cycles if limit else 0,
        limit_source=_source(index, left),
        cycles_used=left.used_cycles,
        cycles_by_rating=", ".join(f"{rating} {cycles}" for rating, cycles in then.flown if cycles),
        counting_rule=number.counting_rule,
        used_frac=left.used_frac,
        cycles_left=left.cycles,
        hours_left=left.hours,
        days_left=left.days,
        life_known=part.life_known and limit is not None,
        state=state_of(left, known=part.life_known, band_cycles=index.fleet.settings.warning_band_cycles),
        date_reached=index.date(reached),
        value_left_usd=number.price_usd * left.left_frac,
        owner=part.owner,
    )


def _source(index: LifeIndex, left: Left) -> str:
    if left.limit is None:
        return "no limit is published"
    since = left.limit.valid_from_day
    name = left.limit.directive or left.limit.source or "not named"
    return name if since is None else f"{name} from {index.date(since)}"


def _engine_lives(
    index: LifeIndex, parts: tuple[PartLife, ...], *, tail: str | None, engine: str | None
) -> tuple[EngineLife, ...]:
    by_engine: dict[str, list[PartLife]] = {}
    for part in parts:
        by_engine.setdefault(part.engine_serial, []).append(part)
    rows = []
    for serial, fact in index.engines.items():
        if (engine is not None and serial != engine) or (tail is not None and index.hangs_on(serial) != tail):
            continue
        least = sorted(by_engine.get(serial, ()), key=lambda row: (row.cycles_left, row.part_serial))[:3]
        first, second, third = [*least, None, None, None][:3]
        dates = [row.date_reached for row in by_engine.get(serial, ()) if row.date_reached is not None]
        rows.append(
            EngineLife(
                engine_serial=serial,
                tail=index.hangs_on(fact.engine_serial),
                rating=first.rating if first else "",
                cycles_left=first.cycles_left if first else 0,
                state=first.state if first else "unknown",
                limiting_part_serial=first.part_serial if first else "",
                date_reached=min(dates, default=None),
                second_part_serial=second.part_serial if second else "",
                second_cycles_left=second.cycles_left if second else None,
                third_part_serial=third.part_serial if third else "",
                third_cycles_left=third.cycles_left if third else None,
            )
        )
    return tuple(sorted(rows, key=lambda row: (row.cycles_left, row.date_reached or dt.date.max, row.engine_serial)))
