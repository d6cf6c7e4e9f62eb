"""From a fleet's past removals to lives by module and cause, on the clock that the hazard counts.

A stretch that ended for another reason, or still runs, is a life of this cause that was not seen to fail. Ages flown in
a harsh place are turned into ages in environment 1 by the hazard's own exponent, so that the scale comes out as the
table ``hazards`` holds it.
"""

from __future__ import annotations

import datetime as dt
from collections import defaultdict
from typing import NamedTuple

import numpy as np

from planner.fit_hazard import Lives, lives
from planner.records import Records
from sim.fleet import Fleet, Hazard


class Stretch(NamedTuple):
    """One row of the table ``removals``; ages in cycles and hours, environment where it flew (None: not known)."""

    serial: str
    engine_type: str
    module: str
    cause: str
    run: str
    failed: bool
    cycles: tuple[float, float]
    hours: tuple[float, float]
    last_good_cycles: float | None
    removed: dt.date | None
    environment: float | None

    def ages(self, clock: str) -> tuple[float, float]:
        return self.cycles if clock == "cycles" else self.hours

    def last_good(self, clock: str) -> float:
        """Return the age last seen good (NaN: the age of the failure is exact)."""
        if self.last_good_cycles is None:
            return np.nan
        if clock == "cycles":
            return self.last_good_cycles
        flown = self.cycles[1] - self.cycles[0]
        share = (self.last_good_cycles - self.cycles[0]) / flown if flown > 0.0 else 1.0
        return self.hours[0] + share * (self.hours[1] - self.hours[0])


class Group(NamedTuple):
    """Lives of one cause of a module: those of one run, or of both where the table gives both the same law."""

    engine_type: str
    module: str
    cause: str
    runs: tuple[str, ...]
    law: Hazard
    in_table: bool


def stretches(records: Records, fleet: Fleet) -> tuple[list[Stretch], list[str]]:
    """Return the past removals and what had to be assumed of them."""
    where = _Places(records, fleet)
    found = []
    names = (
        "serial",
        "engine_type",
        "module",
        "cause",
        "run",
        "ended",
        "cycles_at_install",
        "cycles_at_removal",
        "hours_at_install",
        "hours_at_removal",
        "cycles_last_seen_good",
        "removed_date",
    )
    for _, serial, kind, module, cause, run, ended, c0, c1, h0, h1, good, removed in records["removals"].pick(*names):
        stretch = Stretch(
            serial,
            kind,
            module,
            cause,
            run,
            ended == "failed",
            (float(c0), float(c1)),
            (float(h0 or 0.0), float(h1 or 0.0)),
            None if good is None else float(good),
            removed,
            where.environment(serial, removed),
        )
        found.append(stretch)
    found, trimmed = without_overlaps(found)
    notes = []
    if trimmed:
        notes.append(
            f"{trimmed} stretches of first runs begin before the last of their serial ended; what overlaps counts once"
        )
    homeless = sum(one.environment is None for one in found)
    if homeless and any(row.environment_exponent for row in fleet.hazards):
        notes.append(f"{homeless} of {len(found)} stretches flew at a base that the records do not tell: counted at 1")
    return found, notes


def without_overlaps(found: list[Stretch]) -> tuple[list[Stretch], int]:
    """Return stretches of which none covers an age that another of the same serial has told, for first runs: nothing
    set their ages back, so a second row from the same start holds the first one's cycles again."""
    told: dict[str, tuple[float, float]] = {}
    result, trimmed = [], 0
    for one in sorted(found, key=lambda row: (row.cycles[1], row.removed or dt.date.max)):
        last = told.get(one.serial)
        if one.run == "first" and last is not None and one.cycles[0] < last[0]:
            trimmed += 1
            one = one._replace(
                cycles=(last[0], max(one.cycles[1], last[0])), hours=(last[1], max(one.hours[1], last[1]))
            )
        if one.run == "first":
            told[one.serial] = (one.cycles[1], one.hours[1])
        result.append(one)
    return result, trimmed


class _Places:
    """Where a module flew: its engine of today, and the tail that this engine hung on at the time."""

    def __init__(self, records: Records, fleet: Fleet) -> None:
        bases = {row.base: row.environment for row in fleet.bases}
        self._tails = {row.tail: bases.get(row.base, 1.0) for row in fleet.aircraft}
        self._engine = {row.module_serial: row.engine_serial for row in fleet.modules if row.engine_serial}
        self._now = {row.engine_serial: row.tail for row in fleet.engines}
        self._links: dict[str, list[tuple[dt.date, dt.date, str]]] = defaultdict(list)
        for _, serial, parent, on, off in records["installs"].pick("serial", "parent_serial", "on_date", "off_date"):
            if parent in self._tails and on is not None:
                self._links[serial].append((on, off or dt.date.max, parent))

    def environment(self, serial: str, date: dt.date | None) -> float | None:
        engine = self._engine.get(serial, "")
        if date is not None:
            for on, off, tail in self._links[engine]:
                if on <= date <= off:
                    return self._tails[tail]
        return self._tails.get(self._now.get(engine, ""))


def groups(fleet: Fleet, found: list[Stretch]) -> list[Group]:
    """Return what is to be fitted: every chance cause of the table, and every failure that the table does not have."""
    result: list[Group] = []
    laws: dict[tuple[str, str, str], dict[str, Hazard]] = defaultdict(dict)
    for row in fleet.hazards:
        laws[row.engine_type, row.module, row.cause][row.run] = row
    for (kind, module, cause), runs in laws.items():
        alike = {(r.shape, r.scale, r.clock, r.counted_from, r.environment_exponent) for r in runs.values()}
        if len(alike) == 1:
            result.append(Group(kind, module, cause, tuple(runs), next(iter(runs.values())), True))
        else:
            result += [Group(kind, module, cause, (run,), law, True) for run, law in runs.items()]
    known = {(g.engine_type, g.module, g.cause, run) for g in result for run in g.runs}
    for one in found:
        key = (one.engine_type, one.module, one.cause, one.run)
        if one.failed and one.cause in ("distress", "unscheduled") and key not in known:
            known.add(key)
            law = Hazard(engine_type=key[0], module=key[1], cause=key[2], run=key[3])
            result.append(Group(*key[:3], (one.run,), law, False))
    return result


def lives_of(group: Group, found: list[Stretch]) -> Lives:
    """Return the lives of a cause, on its clock and in environment 1. Raises RequestError for ages out of order."""
    law = group.law
    mine = [
        one
        for one in found
        if (one.engine_type, one.module) == (group.engine_type, group.module) and one.run in group.runs
    ]
    factor = np.array([(one.environment or 1.0) ** law.environment_exponent for one in mine])
    ages = np.array([one.ages(law.clock) for one in mine]).reshape(len(mine), 2)
    start = ages[:, 0] if law.counted_from == "build" else np.zeros(len(mine))
    fails = np.array([one.failed and one.cause == group.cause for one in mine], dtype=bool)
    good = np.array([one.last_good(law.clock) for one in mine]).reshape(len(mine))
    return lives(
        (ages[:, 1] - start) * factor,
        fails,
        entries=(ages[:, 0] - start) * factor,
        last_good=np.where(fails, (good - start) * factor, np.nan),
    )
