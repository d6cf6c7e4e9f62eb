"""Rules on the chain of a part's history, and on who was built into what when."""

from __future__ import annotations

import datetime as dt
from collections.abc import Iterator
from itertools import pairwise

from planner.checks.facts import Facts
from planner.checks.fault import Fault, Rule, stops, warns

_DAY = dt.timedelta(days=1)


def history_adds_up_to_cycles_since_new(facts: Facts) -> Iterator[Fault]:
    if not facts.told("part_history"):
        return
    history = facts.history
    for row, serial, cycles in facts.records["parts"].pick("part_serial", "cycles_since_new"):
        total = sum(history.get(serial, {}).values())
        if cycles is None or cycles == total:
            continue
        if cycles > total:
            message = (
                f"{serial}: the history has {total:,} of {cycles:,} cycles; short and unexplained, "
                "its life counts as zero"
            )
        else:
            message = (
                f"{serial}: the history has {total:,} cycles, more than {cycles:,} since new; the longer count holds"
            )
        yield Fault("parts", row, "cycles_since_new", f"{cycles:,}", f"{total:,} as in its history", message)


def history_has_no_unexplained_gap(facts: Facts) -> Iterator[Fault]:
    """A gap in days is a gap only where cycles are missing too: a part on a shelf flies nothing."""
    counts = dict(zip(facts.records["parts"]["part_serial"], facts.records["parts"]["cycles_since_new"], strict=True))
    for serial, stretches in facts.stretches.items():
        missing = (counts.get(serial) or 0) - sum(stretch.cycles for stretch in stretches)
        if missing <= 0:
            continue
        for before, after in pairwise(stretches):
            if after.first > before.last + _DAY:
                gap = f"{before.last + _DAY} to {after.first - _DAY}"
                message = (
                    f"{serial}: nothing is recorded from {gap} and {missing:,} cycles are missing; "
                    "its life counts as zero"
                )
                yield Fault("part_history", after.row, "from_date", gap, "no gap", message)


def history_stretches_do_not_overlap(facts: Facts) -> Iterator[Fault]:
    for serial, stretches in facts.stretches.items():
        for before, after in pairwise(stretches):
            if after.first < before.last:
                message = (
                    f"{serial} flies from {after.first} while row {before.row} has it until {before.last}; mend one"
                )
                yield Fault(
                    "part_history", after.row, "from_date", str(after.first), f"{before.last} or later", message
                )


def history_begins_after_manufacture(facts: Facts) -> Iterator[Fault]:
    made = dict(zip(facts.records["parts"]["part_serial"], facts.records["parts"]["made_date"], strict=True))
    for row, serial, first in facts.records["part_history"].pick("part_serial", "from_date"):
        day = made.get(serial)
        if day and first and first < day:
            message = f"{serial} flies from {first}, before it was made on {day}; mend one of them"
            yield Fault("part_history", row, "from_date", str(first), f"{day} or later", message)


def history_fits_into_its_days(facts: Facts) -> Iterator[Fault]:
    for serial, stretches in facts.stretches.items():
        for stretch in stretches:
            days = (stretch.last - stretch.first).days + 1
            if days > 0 and (stretch.hours > 24 * days or stretch.cycles > 40 * days):
                found = f"{stretch.hours:,g} hours and {stretch.cycles:,} cycles in {days} days"
                message = f"{serial} flies {found}, more than a day holds; mend the stretch"
                yield Fault(
                    "part_history", stretch.row, "hours", found, "at most 24 hours and 40 flights a day", message
                )


def ratings_flown_agree_with_those_of_the_tail(facts: Facts) -> Iterator[Fault]:
    if not facts.told("rating_changes"):
        return
    changes: dict[str, list[tuple[dt.date, str]]] = {}
    for _, tail, date, rating in facts.records["rating_changes"].pick("tail", "from_date", "rating"):
        if tail and date and rating:
            changes.setdefault(tail, []).append((date, rating))
    for rows in changes.values():
        rows.sort()
    names = ("part_serial", "tail", "rating", "from_date", "to_date")
    for row, serial, tail, rating, first, last in facts.records["part_history"].pick(*names):
        known = changes.get(tail)
        if not known or not first or not rating:
            continue
        flown = [held for day, held in known if day <= first][-1:]
        flown += [held for day, held in known if first < day < (last or facts.as_of)]
        if flown and set(flown) != {rating}:
            message = (
                f"{serial} flew at {rating} on {tail}, which was rated {' then '.join(flown)} then; the stretch holds"
            )
            yield Fault("part_history", row, "rating", rating, " then ".join(flown), message)


def rating_changes_end_at_the_rating_of_today(facts: Facts) -> Iterator[Fault]:
    last: dict[str, tuple[dt.date, str, int]] = {}
    for row, tail, date, rating in facts.records["rating_changes"].pick("tail", "from_date", "rating"):
        if tail and date and rating and date <= facts.as_of:
            last[tail] = max(last.get(tail, (dt.date.min, "", 0)), (date, rating, row))
    for tail, (_, rating, row) in last.items():
        fact = facts.tails.get(tail)
        if fact and fact.rating and fact.rating != rating:
            message = f"{tail} changed to {rating} last and is rated {fact.rating} in aircraft; the latter is used"
            yield Fault("rating_changes", row, "rating", rating, fact.rating, message)


def installations_do_not_overlap(facts: Facts) -> Iterator[Fault]:
    by_serial: dict[str, list[tuple[dt.date, dt.date, int, str]]] = {}
    for row, serial, parent, on, off in facts.records["installs"].pick(
        "serial", "parent_serial", "on_date", "off_date"
    ):
        if serial and parent and on and (row, "off_date") not in facts.records["installs"].faulty:
            by_serial.setdefault(serial, []).append((on, off or dt.date.max, row, parent))
    for serial, links in by_serial.items():
        links.sort()
        for (_, off, before_row, parent), (on, _, row, later) in pairwise(links):
            if on < off:
                message = f"{serial} goes into {later} on {on} while row {before_row} has it in {parent}; mend one"
                yield Fault("installs", row, "on_date", str(on), "after it came out", message)


def open_installations_agree_with_the_tables(facts: Facts) -> Iterator[Fault]:
    parts = facts.records["parts"]
    parents = {serial: engine.tail for serial, engine in facts.engines.items()}
    parents |= {serial: module.engine_serial for serial, module in facts.modules.items()}
    parents |= {
        serial: module for serial, module in zip(parts["part_serial"], parts["module_serial"], strict=True) if serial
    }
    bad = facts.records["installs"].faulty
    for row, serial, parent, off in facts.records["installs"].pick("serial", "parent_serial", "off_date"):
        if off is None and (row, "off_date") not in bad and parent and serial in parents and parents[serial] != parent:
            now = parents[serial] or "nothing"
            message = f"{serial} is in {parent} by this open link and in {now} by its own table; the latter is used"
            yield Fault("installs", row, "parent_serial", parent, now, message)


HISTORY_RULES: tuple[Rule, ...] = (
    warns(history_adds_up_to_cycles_since_new),
    warns(history_has_no_unexplained_gap),
    stops(history_stretches_do_not_overlap),
    stops(history_begins_after_manufacture),
    stops(history_fits_into_its_days),
    warns(ratings_flown_agree_with_those_of_the_tail),
    warns(rating_changes_end_at_the_rating_of_today),
    stops(installations_do_not_overlap),
    warns(open_installations_agree_with_the_tables),
)
