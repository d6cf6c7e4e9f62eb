"""A directive that cuts limits: who is hit, when each part must be off, and the value of the life that is lost."""

from __future__ import annotations

import datetime as dt
from typing import NamedTuple

from planner.life_index import LifeIndex
from planner.part_outlook import left_at
from sim import life
from sim.fleet import Part, PartLimit


class DirectiveLife(NamedTuple):
    """One part hit; columns as in the output table ``life_directives``. Cycles left are those of today."""

    directive: str
    valid_from: dt.date | None
    part_serial: str
    engine_serial: str
    tail: str
    rating: str
    limit_before_cycles: int
    limit_after_cycles: int
    cycles_left_before: int
    cycles_left_after: int
    over_on_day_one: bool
    date_reached: dt.date | None
    value_lost_usd: float


def directive_lives(index: LifeIndex) -> tuple[DirectiveLife, ...]:
    """Return every part that a directive of the records hits, by directive and date."""
    by_number: dict[str, list[PartLimit]] = {}
    for row in index.fleet.part_limits:
        if row.directive:
            by_number.setdefault(row.part_number, []).append(row)
    found = []
    for part in index.fleet.parts:
        names = {row.directive for row in by_number.get(part.part_number, ()) if life.holds_for(row, part.part_serial)}
        found += [_hit(index, part, name) for name in sorted(names)]
    return tuple(sorted(found, key=lambda r: (r.directive, r.date_reached or dt.date.max, r.part_serial)))


def _hit(index: LifeIndex, part: Part, directive: str) -> DirectiveLife:
    rows = index.limits_of(part)
    mine = [row for row in rows if row.directive == directive]
    without = tuple(row for row in rows if row.directive != directive)
    rule, price = index.numbers[part.part_number].counting_rule, index.numbers[part.part_number].price_usd
    start = max((row.valid_from_day or 0.0 for row in mine), default=0.0)
    day = max(0.0, start)
    _, today = index.left(part, 0.0)
    before = left_at(part, today.rating, without, rule=rule, day=day)
    after = left_at(part, today.rating, rows, rule=rule, day=day)
    then, on_the_day = index.left(part, day)
    return DirectiveLife(
        directive=directive,
        valid_from=index.date(start) if any(row.valid_from_day is not None for row in mine) else None,
        part_serial=part.part_serial,
        engine_serial=index.engine_of(part),
        tail=index.tail_of(part),
        rating=today.rating,
        limit_before_cycles=before.limit.limit_cycles if before.limit else 0,
        limit_after_cycles=after.limit.limit_cycles if after.limit else 0,
        cycles_left_before=before.cycles,
        cycles_left_after=after.cycles,
        over_on_day_one=then.life_known and on_the_day.cycles == 0,
        date_reached=index.date(index.day_reached(part, 0.0)),
        value_lost_usd=price * max(0.0, before.left_frac - after.left_frac),
    )
