"""Rules on life against limits, today and on the dates that are announced."""

from __future__ import annotations

import math
from collections.abc import Iterator
from itertools import pairwise

from planner.checks.facts import Facts, PartFact
from planner.checks.fault import Fault, Rule, stops, warns
from sim import life


def used_life_is_within_limit(facts: Facts) -> Iterator[Fault]:
    for part in facts.parts:
        if part.over and part.limit is not None:
            message = (
                f"{part.cycles:,} is past the limit {part.limit.limit_cycles:,} of {part.number} "
                f"at rating {part.rating} "
                f"by {part.over:,}; check the limit's revision or remove the part"
            )
            found = f"{part.cycles:,}"
            yield Fault("parts", part.row, "cycles_since_new", found, f"at most {part.limit.limit_cycles:,}", message)


def parts_that_fly_have_a_cycle_left(facts: Facts) -> Iterator[Fault]:
    for part in facts.parts:
        if _flies(facts, part) and part.life.known and part.limit and not part.left and not part.over:
            message = (
                f"{part.serial} is at its limit of {part.limit.limit_cycles:,}; taken as coming off on the as-of date"
            )
            yield Fault("parts", part.row, "cycles_since_new", f"{part.cycles:,}", "a cycle left", message)


def _flies(facts: Facts, part: PartFact) -> bool:
    module = facts.modules.get(part.module_serial)
    engine = facts.engines.get(module.engine_serial) if module else None
    return engine is not None and engine.place in ("wing", "leased_in")


def used_hours_are_within_limit(facts: Facts) -> Iterator[Fault]:
    rows = facts.records["parts"]
    hours = dict(zip(rows["part_serial"], rows["hours_since_new"], strict=True))
    for part in facts.parts:
        most = part.limit.limit_hours if part.limit else None
        used = hours.get(part.serial)
        if most is not None and used is not None and used > most:
            message = (
                f"{used:,g} is past the limit of {most:,} hours of {part.number}; check the limit or remove the part"
            )
            yield Fault("parts", part.row, "hours_since_new", f"{used:,g}", f"at most {most:,}", message)


def age_is_within_limit(facts: Facts) -> Iterator[Fault]:
    rows = facts.records["parts"]
    made = dict(zip(rows["part_serial"], rows["made_date"], strict=True))
    for part in facts.parts:
        most = part.limit.limit_days if part.limit else None
        if most is None:
            continue
        day = made.get(part.serial)
        if day is not None and (facts.as_of - day).days > most:
            message = (
                f"{part.serial} was made {(facts.as_of - day).days:,} days ago, the limit is {most:,}; remove the part"
            )
            yield Fault("parts", part.row, "made_date", str(day), f"at most {most:,} days ago", message)


def parts_with_a_limit_in_hours_or_days_have_them_counted(facts: Facts) -> Iterator[Fault]:
    rows = facts.records["parts"]
    known = dict(zip(rows["part_serial"], zip(rows["hours_since_new"], rows["made_date"], strict=True), strict=True))
    for part in facts.parts:
        if part.limit is None:
            continue
        hours, made = known.get(part.serial, (None, None))
        for most, value, column in (
            (part.limit.limit_hours, hours, "hours_since_new"),
            (part.limit.limit_days, made, "made_date"),
        ):
            if most is not None and value is None:
                message = (
                    f"{part.serial} has a limit in {column.split('_')[0]} but {column} is blank; its "
                    "life counts as zero"
                )
                yield Fault("parts", part.row, column, "blank", "a value", message)


def life_of_every_part_is_known(facts: Facts) -> Iterator[Fault]:
    faulty = facts.records["parts"].faulty
    for part in facts.parts:
        # what the history lacks and what could not be read is told by other rules
        if not part.life.known and not part.life.short and (part.row, "cycles_since_new") not in faulty:
            message = f"{part.serial}: {part.life.why}; its life counts as zero"
            yield Fault("parts", part.row, "cycles_since_new", part.life.why, "life that records prove", message)


def limits_are_published_for_every_rating_flown(facts: Facts) -> Iterator[Fault]:
    if not facts.told("part_limits") or not facts.told("ratings"):
        return
    published: dict[str, set[str]] = {}
    for _, limit in facts.limit_rows:
        if not limit.directive and (limit.valid_from_day or 0.0) <= 0.0:
            published.setdefault(limit.part_number, set()).add(limit.rating)
    for part in facts.parts:
        flown = {rating for rating, cycles in part.life.flown if cycles and rating} | {part.rating}
        missing = sorted(flown - published.get(part.number, set()) - {""})
        if missing:
            names = ", ".join(missing)
            message = f"{part.serial}: no limit of {part.number} is in force at rating {names}; its life counts as zero"
            yield Fault("parts", part.row, "part_number", names, "a row of part_limits", message)


def announced_cuts_leave_life(facts: Facts) -> Iterator[Fault]:
    """A directive whose date lies ahead: who is hit, and who is past the new limit already."""
    coming = {limit.part_number for _, limit in facts.limit_rows if limit.directive and (limit.valid_from_day or 0) > 0}
    for part in facts.parts:
        kind = facts.numbers[part.number]
        if part.number not in coming or part.limit is None or not part.life.known:
            continue
        rows = facts.limits_of(part.serial, part.number)
        for row in rows:
            day = row.valid_from_day or 0.0
            if not row.directive or day <= 0 or row.rating != part.rating:
                continue
            held = life.in_force(rows, part.rating, day)
            if held is None or held.limit_cycles >= part.limit.limit_cycles:
                continue
            left = life.cycles_left(part.life.flown, part.rating, rows, rule=kind.rule, day=day)
            message = (
                f"{part.serial}: {row.directive} cuts its limit from {part.limit.limit_cycles:,} "
                f"to {row.limit_cycles:,} at "
                f"rating {part.rating} in {day:,.0f} days; with today's cycles {left:,} are left then"
                + (", it may not fly from that day" if not left else "")
            )
            expected = f"life under the limit of {row.limit_cycles:,}"
            yield Fault("parts", part.row, "cycles_since_new", f"{part.cycles:,}", expected, message)


def limits_do_not_rise_with_thrust(facts: Facts) -> Iterator[Fault]:
    for number, kind in facts.numbers.items():
        thrusts = facts.thrusts.get(kind.engine_type, {})
        rows = tuple(row for row in facts.limits.get(number, ()) if not row.serial_prefix and row.serial_from is None)
        held = {rating: life.in_force(rows, rating, 0.0) for rating in thrusts}
        by_thrust = sorted((thrust, rating) for rating, thrust in thrusts.items() if held[rating])
        numbers = {id(limit): row for row, limit in facts.limit_rows}
        for (_, low), (_, high) in pairwise(by_thrust):
            below, above = held[low], held[high]
            if below and above and above.limit_cycles > below.limit_cycles:
                message = (
                    f"{number} has {above.limit_cycles:,} at {high} and only "
                    f"{below.limit_cycles:,} at {low}, which has less "
                    "thrust; used as they stand, look whether a limit stands in the column of another rating"
                )
                row = numbers.get(id(above))
                yield Fault(
                    "part_limits",
                    row,
                    "limit_cycles",
                    f"{above.limit_cycles:,}",
                    f"at most {below.limit_cycles:,}",
                    message,
                )


def serial_ranges_run_upwards(facts: Facts) -> Iterator[Fault]:
    for row, limit in facts.limit_rows:
        if limit.serial_from is not None and limit.serial_to is not None and limit.serial_to < limit.serial_from:
            message = f"the range {limit.serial_from} to {limit.serial_to} holds no serial; mend it"
            yield Fault("part_limits", row, "serial_to", str(limit.serial_to), f"at least {limit.serial_from}", message)


def serials_can_be_held_against_ranges(facts: Facts) -> Iterator[Fault]:
    ranged = {
        limit.part_number
        for _, limit in facts.limit_rows
        if limit.serial_from is not None or limit.serial_to is not None
    }
    for row, serial, number in facts.records["parts"].pick("part_serial", "part_number"):
        if number in ranged and serial and not serial[-1].isdigit():
            message = (
                f"{serial} does not end in a number, so it cannot be told whether a range of {number} holds it; mend it"
            )
            yield Fault("parts", row, "part_serial", serial, "letters, then a number", message)


def ranges_hold_a_serial(facts: Facts) -> Iterator[Fault]:
    if not facts.told("parts"):
        return
    by_number: dict[str, list[str]] = {}
    for part in facts.parts:
        by_number.setdefault(part.number, []).append(part.serial)
    for row, limit in facts.limit_rows:
        if not limit.serial_prefix and limit.serial_from is None and limit.serial_to is None:
            continue
        if not any(life.holds_for(limit, serial) for serial in by_number.get(limit.part_number, ())):
            what = limit.directive or limit.source or "the row"
            message = (
                f"{what} holds for no part of {limit.part_number} in this fleet; look whether prefix "
                "and numbers are right"
            )
            yield Fault("part_limits", row, "serial_prefix", limit.serial_prefix, "a serial of the fleet", message)


def directives_cut_limits(facts: Facts) -> Iterator[Fault]:
    for row, limit in facts.limit_rows:
        if not limit.directive:
            continue
        general = life.in_force(
            tuple(held for held in facts.limits[limit.part_number] if not held.directive),
            limit.rating,
            max(0.0, limit.valid_from_day or 0.0),
        )
        most = math.inf if general is None else general.limit_cycles
        if limit.limit_cycles >= most:
            message = (
                f"{limit.directive} has {limit.limit_cycles:,} where {most:,} holds; a directive "
                "only cuts, the lower holds"
            )
            yield Fault("part_limits", row, "limit_cycles", f"{limit.limit_cycles:,}", f"below {most:,}", message)


def limits_name_their_source(facts: Facts) -> Iterator[Fault]:
    for row, limit in facts.limit_rows:
        if not limit.source and not limit.directive:
            message = f"the limit of {limit.part_number} at {limit.rating} names no source; used as it stands"
            yield Fault("part_limits", row, "source", "blank", "document and revision", message)


LIFE_RULES: tuple[Rule, ...] = (
    stops(used_life_is_within_limit),
    warns(parts_that_fly_have_a_cycle_left),
    stops(used_hours_are_within_limit),
    stops(age_is_within_limit),
    warns(parts_with_a_limit_in_hours_or_days_have_them_counted),
    warns(life_of_every_part_is_known),
    warns(limits_are_published_for_every_rating_flown),
    warns(announced_cuts_leave_life),
    warns(limits_do_not_rise_with_thrust),
    stops(serial_ranges_run_upwards),
    stops(serials_can_be_held_against_ranges),
    warns(ranges_hold_a_serial),
    warns(directives_cut_limits),
    warns(limits_name_their_source),
)
