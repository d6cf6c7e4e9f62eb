"""From a fleet's records to stretches of readings that can be fitted, grouped by what wears alike.

What is known of an engine's use goes into each stretch: environment and derate of its aircraft, hours a cycle, how long
ago its modules were restored, and when it was washed (as recorded, else by the base's plan).
"""

from __future__ import annotations

import datetime as dt
import math
from collections import Counter, defaultdict
from typing import NamedTuple

import numpy as np

from planner.fit_margin import Stretch
from planner.fit_margin_ahead import tooth_floor
from planner.fit_margin_pool import Belief
from planner.planned_use import PlannedUse
from planner.records import Records
from sim.fleet import Aircraft, Engine, EngineType, Fleet, Wash, WearRow
from sim.season import Season
from sim.wear import derate_factor

DAYS_PER_YEAR = 365.25


class Reading(NamedTuple):
    """One row of the table ``margins``; the day counts from the as-of date."""

    day: float
    cycles: int
    margin_degC: float
    event: str


class Part(NamedTuple):
    """Readings between two visits; ``first``: the count at which it begins (zero, or that of a visit that did not set
    the count back)."""

    first: float
    rows: list[Reading]


class Current(NamedTuple):
    """An engine's last stretch: where it is in its group, and what its future needs. ``first_cycles`` turns the
    stretch's cycles into cycles since installation."""

    engine: Engine
    kind: EngineType
    aircraft: Aircraft | None
    use: PlannedUse | None
    number: int
    now_cycles: float
    first_cycles: float
    gain_floor: float
    environment: float


class Group(NamedTuple):
    """Stretches of one type at one rating, the current ones among them, what the tables say of them, and the numbers of
    the stretches whose washes are the base's plan and not marked in the readings."""

    engine_type: str
    rating: str
    stretches: list[Stretch]
    current: list[Current]
    belief: Belief
    washed_by_plan: frozenset[int]


def groups(records: Records, fleet: Fleet) -> tuple[list[Group], list[str]]:
    """Return the groups of a fleet's readings, and sentences on readings that were left out."""
    engines = {row.engine_serial: row for row in fleet.engines}
    readings, strangers = _readings(records, engines, fleet.settings.as_of)
    facts = _Facts(records, fleet)
    members: dict[tuple[str, str], list[str]] = defaultdict(list)
    for serial in readings:
        members[engines[serial].engine_type, facts.rating(engines[serial])].append(serial)
    found = [
        facts.group(kind, rating, {serial: readings[serial] for serial in serials})
        for (kind, rating), serials in sorted(members.items())
    ]
    left_out = [f"readings of engines that are not in engines.csv are left out: {strangers}"] if strangers else []
    silent = [row.engine_serial for row in fleet.engines if row.engine_serial not in readings]
    if silent and readings:
        named = ", ".join(silent[:5]) + (" ..." if len(silent) > 5 else "")
        left_out.append(f"engines without a reading are not shown: {len(silent)} ({named})")
    return found, left_out


def _readings(records: Records, engines: dict[str, Engine], as_of: dt.date) -> tuple[dict[str, list[Reading]], int]:
    """Return each engine's readings in order of date and cycles, and how many belong to no engine."""
    found: dict[str, list[Reading]] = defaultdict(list)
    strangers = 0
    names = ("engine_serial", "date", "cycles_since_install", "margin_degC", "event")
    for _, serial, date, cycles, margin, event in records["margins"].pick(*names):
        if serial not in engines:
            strangers += 1
        elif date is not None and margin is not None and date <= as_of:
            found[serial].append(Reading(float((date - as_of).days), int(cycles or 0), float(margin), event or ""))
    for rows in found.values():
        rows.sort(key=lambda one: one.day)
    return dict(found), strangers


def split(rows: list[Reading]) -> list[Part]:
    """Return the readings of one engine parted at visits: where cycles since installation fall, or a visit stands."""
    parts: list[Part] = []
    for row in rows:
        falls = not parts or row.cycles < parts[-1].rows[-1].cycles
        if falls or row.event == "visit":
            parts.append(Part(0.0 if falls else float(row.cycles), []))
        parts[-1].rows.append(row)
    return parts


class _Facts:
    """Rows of a fleet by what names them, and the stretches made from them."""

    def __init__(self, records: Records, fleet: Fleet) -> None:
        self._as_of = fleet.settings.as_of
        self._fleet = fleet
        self._kinds = {row.engine_type: row for row in fleet.engine_types}
        self._engines = {row.engine_serial: row for row in fleet.engines}
        self._tails = {row.tail: row for row in fleet.aircraft}
        self._environment = {row.base: row.environment for row in fleet.bases}
        self._washes = {(row.engine_type, row.base): row for row in fleet.washes}
        self._season = Season(fleet.settings.as_of, fleet.season)
        self._modules = defaultdict(list)
        for module in fleet.modules:
            self._modules[module.engine_serial].append(module)
        self._last_tail: dict[str, tuple[dt.date, str]] = {}
        for _, serial, parent, date in records["installs"].pick("serial", "parent_serial", "on_date"):
            if parent in self._tails and date >= self._last_tail.get(serial, (date, ""))[0]:
                self._last_tail[serial] = (date, parent)
        self._changes = defaultdict(list)
        for _, tail, date in records["rating_changes"].pick("tail", "from_date"):
            if date is not None:
                self._changes[tail].append(float((date - self._as_of).days))
        flown = Counter((row.engine_type, row.rating) for row in fleet.aircraft)
        self._usual = {kind: rating for (kind, rating), _ in sorted(flown.items(), key=lambda one: one[1])}

    def aircraft(self, engine: Engine) -> Aircraft | None:
        """Return the aircraft an engine flies on, or last flew on."""
        tail = engine.tail or self._last_tail.get(engine.engine_serial, (None, ""))[1]
        return self._tails.get(tail)

    def rating(self, engine: Engine) -> str:
        """Return the rating of its aircraft, else the one that most of its type fly at."""
        aircraft = self.aircraft(engine)
        return aircraft.rating if aircraft else self._usual.get(engine.engine_type, "")

    def group(self, kind: str, rating: str, readings: dict[str, list[Reading]]) -> Group:
        wear = [row for row in self._fleet.wear if (row.engine_type, row.rating) == (kind, rating)]
        flown = [self.aircraft(self._engine(serial)) for serial in readings]
        ratios = [one.hours_per_year / one.cycles_per_year for one in flown if one and one.cycles_per_year > 0.0]
        usual = float(np.mean(ratios)) if ratios else 1.0
        gains = [wash.gain_degC for one in flown if one and (wash := self._washes.get((kind, one.base)))]
        belief = Belief(
            steady(wear, usual), sum(row.early_loss_degC for row in wear), float(np.mean(gains)) if gains else 0.0
        )
        stretches: list[Stretch] = []
        current: list[Current] = []
        by_plan: set[int] = set()
        for serial, rows in readings.items():
            parts = split(rows)
            engine, aircraft = self._engine(serial), self.aircraft(self._engine(serial))
            now = self._now(engine, aircraft, parts[-1].rows)
            for part in parts:
                made, planned = self._stretch(serial, part, wear, usual, now=now if part is parts[-1] else None)
                by_plan |= {len(stretches)} if planned else set()
                stretches.append(made)
            current.append(self._current(engine, aircraft, parts[-1].first, len(stretches) - 1, now))
        return Group(kind, rating, stretches, current, belief, frozenset(by_plan))

    def _engine(self, serial: str) -> Engine:
        return self._engines[serial]

    def _now(self, engine: Engine, aircraft: Aircraft | None, rows: list[Reading]) -> float:
        """Return the cycles since installation today: those of the last reading and what was flown since."""
        if aircraft is None or engine.place != "wing":
            return float(rows[-1].cycles)
        return rows[-1].cycles - rows[-1].day / DAYS_PER_YEAR * aircraft.cycles_per_year

    def _stretch(
        self, serial: str, part: Part, wear: list[WearRow], usual: float, *, now: float | None
    ) -> tuple[Stretch, bool]:
        """Return one stretch (``now``: cycles since installation today, None for one that is over), and whether its
        washes are the plan's."""
        engine = self._engine(serial)
        aircraft, kind = self.aircraft(engine), self._kinds[engine.engine_type]
        factor, hours = (
            wear_factor(kind, aircraft, self._environment.get(aircraft.base, 1.0) if aircraft else 1.0),
            usual,
        )
        if aircraft is not None:
            hours = aircraft.hours_per_year / max(aircraft.cycles_per_year, 1e-9)
        first, rows = part
        cycles = np.array([row.cycles - first for row in rows], dtype=float)
        wash = self._washes.get((engine.engine_type, aircraft.base)) if aircraft else None
        marked = tuple(row.cycles - first for row in rows if row.event == "wash")
        planned = not marked and wash is not None
        since_build = max(0.0, engine.cycles_since_build - (now - first)) if now is not None else 0.0
        expected = steady(wear, usual)
        stretch = Stretch(
            serial,
            cycles,
            np.array([row.day for row in rows]),
            np.array([row.margin_degC for row in rows]),
            rate_factor=factor * (steady(wear, hours) / expected if expected > 0.0 else 1.0),
            early_factor=factor * (self._early_share(engine, wear, now - first) if now is not None else 1.0),
            early_scale_cycles=_early_scale(wear),
            half_life_cycles=wash.half_life_cycles if wash else 300.0,
            washes=_by_plan(wash, since_build, cycles[-1] if now is None else now - first)
            if planned and wash
            else marked,
            known_steps=self._steps(rows, cycles, aircraft),
        )
        return stretch, planned

    def _early_share(self, engine: Engine, wear: list[WearRow], now: float) -> float:
        """Return how much of the early loss was to come at the start: modules restored long before had theirs."""
        since = {row.module: row.cycles_since_restoration for row in self._modules[engine.engine_serial]}
        total = sum(row.early_loss_degC for row in wear)
        if total <= 0.0:
            return 1.0
        left = sum(
            row.early_loss_degC * math.exp(-max(0.0, since.get(row.module, now) - now) / row.early_scale_cycles)
            for row in wear
        )
        return max(left / total, 1e-6)

    def _steps(self, rows: list[Reading], cycles: np.ndarray, aircraft: Aircraft | None) -> tuple[float, ...]:
        """Return where a swap or a change of rating makes the margin jump."""
        at = {float(cycle) for row, cycle in zip(rows, cycles, strict=True) if row.event == "swap"}
        for day in self._changes[aircraft.tail] if aircraft else ():
            later = [float(cycle) for row, cycle in zip(rows, cycles, strict=True) if row.day >= day]
            if later and rows[0].day < day:
                at.add(later[0])
        return tuple(sorted(at - {float(cycles[0])}))

    def _current(self, engine: Engine, aircraft: Aircraft | None, first: float, number: int, now: float) -> Current:
        flies = aircraft is not None and engine.place == "wing"
        wash = self._washes.get((engine.engine_type, aircraft.base)) if aircraft else None
        floor = tooth_floor(every_cycles=wash.every_cycles, half_life_cycles=wash.half_life_cycles) if wash else 0.0
        return Current(
            engine=engine,
            kind=self._kinds[engine.engine_type],
            aircraft=aircraft,
            use=PlannedUse(self._fleet, aircraft, season=self._season) if aircraft and flies else None,
            number=number,
            now_cycles=now - first,
            first_cycles=first,
            gain_floor=floor,
            environment=self._environment.get(aircraft.base, 1.0) if aircraft else 1.0,
        )


def wear_factor(kind: EngineType, aircraft: Aircraft | None, environment: float) -> float:
    """Return what environment and derate make of a wear that the table gives for the reference."""
    if aircraft is None:
        return environment
    return environment * derate_factor(
        reference_frac=kind.reference_derate_frac,
        average_frac=aircraft.average_derate_frac,
        wear_frac_per_derate_frac=kind.wear_frac_per_derate_frac,
    )


def steady(wear: list[WearRow], hours_per_cycle: float) -> float:
    """Return the steady loss of all modules by the table, degC per 1,000 cycles."""
    return sum(row.loss_degC_per_1000_cycles + row.loss_degC_per_1000_hours * hours_per_cycle for row in wear)


def _early_scale(wear: list[WearRow]) -> float:
    total = sum(row.early_loss_degC for row in wear)
    if total <= 0.0:
        return 700.0
    return sum(row.early_loss_degC * row.early_scale_cycles for row in wear) / total


def _by_plan(wash: Wash, since_build: float, last: float) -> tuple[float, ...]:
    """Return the washes of a base's plan, one at the build and one at each interval after it."""
    count = int((last + since_build) // wash.every_cycles)
    return tuple(number * float(wash.every_cycles) - since_build for number in range(count + 1))
