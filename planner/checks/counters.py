"""Rules on counters of hours and cycles, and on dates that have to be in order."""

from __future__ import annotations

import datetime as dt
from collections.abc import Iterator
from itertools import pairwise

from planner.checks.facts import Facts
from planner.checks.fault import Fault, Rule, stops, warns

_SHORTEST_FLIGHT_HOURS, _LONGEST_FLIGHT_HOURS = 0.15, 20.0
_LEAST_CYCLES = 200  # below this a ratio says nothing
_BLOCK_TIME_FRAC = 0.06  # taxi time adds some 8 to 15 % to flight hours: own estimate from memory

_SINCE: tuple[tuple[str, str, str, str], ...] = (
    ("engines", "engine_serial", "cycles_since_build", "cycles_since_new"),
    ("modules", "module_serial", "cycles_since_restoration", "cycles_since_new"),
    ("modules", "module_serial", "hours_since_restoration", "hours_since_new"),
    ("modules", "module_serial", "cycles_since_build", "cycles_since_new"),
    ("modules", "module_serial", "hours_since_build", "hours_since_new"),
)
_PAIRS_IN_ORDER: tuple[tuple[str, str, str, str], ...] = (
    ("engines", "engine_serial", "removed_date", "inducted_date"),
    ("engines", "engine_serial", "inducted_date", "ready_date"),
    ("engines", "engine_serial", "removed_date", "ready_date"),
    ("aircraft", "tail", "entry_date", "exit_date"),
    ("installs", "serial", "on_date", "off_date"),
    ("watch", "serial", "found_date", "remove_by_date"),
    ("part_history", "part_serial", "from_date", "to_date"),
)
_PAST: tuple[tuple[str, str, str], ...] = (
    ("engines", "engine_serial", "removed_date"),
    ("engines", "engine_serial", "inducted_date"),
    ("parts", "part_serial", "made_date"),
    ("part_history", "part_serial", "from_date"),
    ("part_history", "part_serial", "to_date"),
    ("margins", "engine_serial", "date"),
    ("removals", "serial", "removed_date"),
    ("watch", "serial", "found_date"),
    ("installs", "serial", "on_date"),
    ("installs", "serial", "off_date"),
)


def counts_since_work_are_within_counts_since_new(facts: Facts) -> Iterator[Fault]:
    for table, key, part, whole in _SINCE:
        for row, serial, since, new in facts.records[table].pick(key, part, whole):
            if since is not None and new is not None and since > new:
                message = f"{serial} has {since:,} {part} but only {new:,} {whole}; mend the one that is wrong"
                yield Fault(table, row, part, f"{since:g}", f"at most {new:g}", message)


def installation_counters_do_not_run_backwards(facts: Facts) -> Iterator[Fault]:
    by_serial: dict[str, list[tuple[dt.date, int, int, float]]] = {}
    names = ("serial", "on_date", "cycles_on", "hours_on")
    for row, serial, on_date, cycles, hours in facts.records["installs"].pick(*names):
        if serial and on_date and cycles is not None and hours is not None:
            by_serial.setdefault(serial, []).append((on_date, row, cycles, hours))
    for serial, stretches in by_serial.items():
        stretches.sort()
        for (_, before_row, *before), (_, row, *after) in pairwise(stretches):
            for column, first, later in zip(("cycles_on", "hours_on"), before, after, strict=True):
                if later < first:
                    message = (
                        f"{serial} had {first:,} at the installation of row {before_row} and "
                        f"{later:,} at this later one"
                    )
                    yield Fault("installs", row, column, f"{later:g}", f"at least {first:g}", message + "; mend one")


def margin_counters_do_not_run_backwards(facts: Facts) -> Iterator[Fault]:
    by_engine: dict[str, list[tuple[dt.date, int, int, str]]] = {}
    names = ("engine_serial", "date", "cycles_since_install", "event")
    for row, serial, date, cycles, event in facts.records["margins"].pick(*names):
        if serial and date and cycles is not None:
            by_engine.setdefault(serial, []).append((date, cycles, row, event or ""))
    for serial, readings in by_engine.items():
        readings.sort(key=lambda one: (one[0], one[2]))
        for (_, first, before_row, _), (_, later, row, event) in pairwise(readings):
            if later < first and event not in ("swap", "visit"):
                message = (
                    f"{serial} had {first:,} cycles at the reading of row {before_row} and {later:,} at this later one "
                    "without a visit; the trend starts anew here"
                )
                yield Fault("margins", row, "cycles_since_install", str(later), f"at least {first}", message)


def removals_end_after_they_begin(facts: Facts) -> Iterator[Fault]:
    for clock in ("cycles", "hours"):
        start, end = f"{clock}_at_install", f"{clock}_at_removal"
        for row, serial, first, last in facts.records["removals"].pick("serial", start, end):
            if first is not None and last is not None and last < first:
                message = (
                    f"{serial} came off at {last:g} {clock}, installed at {first:g}; {clock} run backwards, mend one"
                )
                yield Fault("removals", row, end, f"{last:g}", f"at least {first:g}", message)


def hours_and_cycles_make_a_flight(facts: Facts) -> Iterator[Fault]:
    looked = [
        ("aircraft", "tail", "hours_since_new", "cycles_since_new"),
        ("aircraft", "tail", "hours_per_year", "cycles_per_year"),
        ("engines", "engine_serial", "hours_since_new", "cycles_since_new"),
        ("modules", "module_serial", "hours_since_new", "cycles_since_new"),
    ]
    for table, key, hours_column, cycles_column in looked:
        for row, serial, hours, cycles in facts.records[table].pick(key, hours_column, cycles_column):
            if not hours or not cycles or cycles < _LEAST_CYCLES:
                continue
            if not _SHORTEST_FLIGHT_HOURS <= hours / cycles <= _LONGEST_FLIGHT_HOURS:
                found = f"{hours:,g} hours in {cycles:,g} cycles"
                message = (
                    f"{serial} has {found}, {hours / cycles:.2f} hours a flight; used as it stands, "
                    "look for swapped columns"
                )
                yield Fault(table, row, hours_column, found, "0.15 to 20 hours a flight", message)


def hours_of_aircraft_are_flight_hours_as_of_their_parts(facts: Facts) -> Iterator[Fault]:
    """Hours a cycle of an aircraft against those of the part stretches flown on it: block time is longer."""
    flown: dict[str, list[float]] = {}
    for _, tail, cycles, hours in facts.records["part_history"].pick("tail", "cycles", "hours"):
        if tail and cycles and hours:
            totals = flown.setdefault(tail, [0.0, 0.0])
            totals[0] += hours
            totals[1] += cycles
    names = ("tail", "hours_since_new", "cycles_since_new")
    for row, tail, hours, cycles in facts.records["aircraft"].pick(*names):
        totals = flown.get(tail, [0.0, 0.0])
        if not hours or not cycles or cycles < _LEAST_CYCLES or totals[1] < _LEAST_CYCLES:
            continue
        aircraft, parts = hours / cycles, totals[0] / totals[1]
        if abs(aircraft / parts - 1) > _BLOCK_TIME_FRAC:
            message = (
                f"{tail} has {aircraft:.2f} hours a flight, the parts flown on it {parts:.2f}; "
                "used as it stands, look whether one is block time"
            )
            yield Fault("aircraft", row, "hours_since_new", f"{aircraft:.2f}", f"about {parts:.2f}", message)


def planned_hours_are_flight_hours_as_of_the_past(facts: Facts) -> Iterator[Fault]:
    names = ("tail", "hours_since_new", "cycles_since_new", "hours_per_year", "cycles_per_year")
    for row, tail, hours, cycles, planned_hours, planned_cycles in facts.records["aircraft"].pick(*names):
        if not hours or not cycles or cycles < _LEAST_CYCLES or not planned_hours or not planned_cycles:
            continue
        past, planned = hours / cycles, planned_hours / planned_cycles
        if abs(planned / past - 1) > 0.25:
            message = f"{tail} is planned at {planned:.2f} hours a flight and has flown {past:.2f}; used as it stands"
            yield Fault("aircraft", row, "hours_per_year", f"{planned:.2f}", f"about {past:.2f}", message)


def dates_are_in_order(facts: Facts) -> Iterator[Fault]:
    for table, key, first, later in _PAIRS_IN_ORDER:
        for row, serial, begin, end in facts.records[table].pick(key, first, later):
            if begin and end and end < begin:
                message = f"{serial}: {later} {end} lies before {first} {begin}; mend one of them"
                yield Fault(table, row, later, str(end), f"{begin} or later", message)


def what_has_happened_lies_in_the_past(facts: Facts) -> Iterator[Fault]:
    for table, key, column in _PAST:
        for row, serial, date in facts.records[table].pick(key, column):
            if date and date > facts.as_of:
                message = f"{serial}: {column} {date} lies after the as-of date {facts.as_of}; mend one of them"
                yield Fault(table, row, column, str(date), f"{facts.as_of} or earlier", message)


def work_in_hand_is_not_overdue(facts: Facts) -> Iterator[Fault]:
    for table, key in (("engines", "engine_serial"), ("modules", "module_serial"), ("parts", "part_serial")):
        for row, serial, place, ready in facts.records[table].pick(key, "place", "ready_date"):
            if ready and ready < facts.as_of and place in ("shop", "order"):
                message = f"{serial} should have been ready on {ready}; taken as ready on the as-of date"
                yield Fault(table, row, "ready_date", str(ready), f"{facts.as_of} or later", message)


COUNTER_RULES: tuple[Rule, ...] = (
    stops(counts_since_work_are_within_counts_since_new),
    stops(installation_counters_do_not_run_backwards),
    warns(margin_counters_do_not_run_backwards),
    stops(removals_end_after_they_begin),
    warns(hours_and_cycles_make_a_flight),
    warns(hours_of_aircraft_are_flight_hours_as_of_their_parts),
    warns(planned_hours_are_flight_hours_as_of_the_past),
    stops(dates_are_in_order),
    stops(what_has_happened_lies_in_the_past),
    warns(work_in_hand_is_not_overdue),
)
