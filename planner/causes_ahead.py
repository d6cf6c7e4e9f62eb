"""What will take each engine off: every cause with its dates, and the law of the first removal by month and cause.

Planned causes come on a known cycle: a part's limit (and dated changes of it), a recorded finding, the margin
that runs out along the module's own wear, the end of a lease-in, the tail's return or exit. Chance causes compete
with them: each is a Weibull conditional on the age reached, so the chance that none has struck by a day is ``S =
exp(-sum of hazards gathered)``, cut off at the first planned cause. In a month the removals share out among the
chance causes as their hazards gathered do (competing risks; Lawless, *Statistical Models and Methods for Lifetime
Data*, 2003, ch. 9).

Drawn values that the picture holds are never read. Days count from the as-of date; a month is a calendar month,
the first one starts on the as-of date.
"""

from __future__ import annotations

import datetime as dt
import math
from collections.abc import Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from planner.picture import Picture, cloned
from planner.planned_use import PlannedUse, Stretch
from sim import hazard
from sim.removal import FAR, margin_cycles, part_removal, watch_removal
from sim.state import EngineState, Flying, ModuleState

Floats = NDArray[np.float64]
PLANNED = ("limit", "directive", "unknown_life", "finding", "margin", "lease_end", "return", "exit")
LEVELS = (0.1, 0.5, 0.9)
_FINE_DAYS = 15.0  # step of the grid on which quantiles are read; hazards gathered are smooth between
_LAST_DAY = 40 * 365.25  # what lies beyond is shown as never


class Planned(NamedTuple):
    """A cause on a known day: cycles of the tail from now, the day, the slot (-1: the whole engine), the part's
    serial."""

    cause: str
    slot: int
    cycles: float
    day: float
    part_serial: str


class Chance(NamedTuple):
    """A chance cause of one module: hazard law in the environment flown, and the age reached on its clock."""

    cause: str
    slot: int
    shape: float
    scale: float
    hours: bool
    age: float
    probability: float = 0.0
    ends_after: int = 0


class Ahead(NamedTuple):
    """One engine on one tail: its planned causes by day, and its chance causes."""

    engine_serial: str
    tail: str
    planned: tuple[Planned, ...]
    chances: tuple[Chance, ...]
    use: Usage

    @property
    def planned_day(self) -> float:
        return self.planned[0].day if self.planned else math.inf


class Usage(NamedTuple):
    """How a tail is flown: planned use, counted from the day on which it enters (or the engine is hung on)."""

    use: PlannedUse
    since: float

    def cycles(self, day: float) -> float:
        return self.use.cycles(day) - self.use.cycles(self.since) if day > self.since else 0.0

    def hours(self, day: float) -> float:
        start, end = self.use.cycles(self.since), self.use.cycles(max(day, self.since))
        return self.use.hours(end) - self.use.hours(start)

    def day(self, cycles: float) -> float:
        return self.use.day(self.use.cycles(self.since) + cycles)


class Months:
    """Months given by their edges (days), and what each tail flies by each edge, reckoned once."""

    def __init__(self, edges: Floats) -> None:
        self.edges = edges
        self._flown: dict[tuple[int, float], tuple[PlannedUse, Floats, Floats]] = {}

    def __len__(self) -> int:
        return int(self.edges.size - 1)

    def flown(self, use: Usage) -> tuple[Floats, Floats]:
        """Return cycles and hours flown by each edge, each of shape (months + 1,)."""
        key = (id(use.use), use.since)
        if key not in self._flown:
            cycles = np.array([use.cycles(day) for day in self.edges.tolist()])
            hours = np.array([use.hours(day) for day in self.edges.tolist()])
            # the use is kept with its figures, so that no other one can come to stand at its address
            self._flown[key] = (use.use, cycles, hours)
        return self._flown[key][1:]

    def flown_until(self, use: Usage, stop: float) -> tuple[Floats, Floats]:
        """Return the same, nothing being flown after day ``stop``."""
        cycles, hours = self.flown(use)
        if stop >= float(self.edges[-1]):
            return cycles, hours
        return np.minimum(cycles, use.cycles(stop)), np.minimum(hours, use.hours(stop))


class FirstRemoval(NamedTuple):
    """The law of an engine's first removal: chance in each month by (cause, slot), shape (months, causes), and
    the chance
    to be still on at the end of each month, shape (months,)."""

    causes: tuple[tuple[str, int], ...]
    by_month: Floats
    still_on: Floats


def ahead(view: Picture, engine: EngineState, tail: str, *, since: float = 0.0, dated: bool = True) -> Ahead:
    """Return what will take an engine off a tail on which it is from day ``since`` on, in the state that it has then.

    ``dated`` false leaves the ends out that a calendar day brings to tail or lease.
    """
    use = Usage(view.uses[tail], max(since, view.tails[tail].row.entry_day or 0.0))
    planned = _planned(view, engine, tail, use)
    if dated:
        planned += _dated(view, engine, tail, use)
    planned.sort(key=lambda one: (one.day, PLANNED.index(one.cause), one.slot))
    return Ahead(engine.serial, tail, tuple(planned), _chances(view, engine, tail), use)


def _planned(view: Picture, engine: EngineState, tail: str, use: Usage) -> list[Planned]:
    """Return the causes that come on a known cycle, one for each module's parts and findings, and the margin.

    Where the tail's rating or use changes first, the engine is flown up to the change and what is left is looked
    at again.
    """
    process, flown = view.tails[tail], 0
    found: dict[tuple[str, int], Planned] = {}
    stretches = [one for one in use.use.stretches if one.day > use.since]
    twin = engine
    for stretch, after in zip((use.use.at_day(use.since), *stretches), (*stretches, None), strict=True):
        flying = process.flying._replace(
            rating=process.spec.ratings.index(stretch.rating), hours_per_cycle=stretch.hours_per_cycle
        )
        left = FAR if after is None else int(use.cycles(after.day) + 1e-6) - flown
        for key, (cause, cycles, part) in _in_stretch(twin, flying, use, flown, _start(stretch, use)).items():
            if key not in found and cycles <= left and cycles < FAR:
                total = float(flown + cycles)
                found[key] = Planned(cause, key[1], total, use.day(total), part)
        if after is None or left <= 0:
            continue
        twin = cloned(twin)
        twin.book(left, flying)
        flown += left
    return [one for one in found.values() if one.day < _LAST_DAY]


def _start(stretch: Stretch, use: Usage) -> float:
    return max(stretch.day, use.since)


def _in_stretch(
    engine: EngineState, flying: Flying, use: Usage, flown: int, day: float
) -> dict[tuple[str, int], tuple[str, float, str]]:
    """Return cycles from the state on to each known cause as the engine is flown in one stretch."""

    def until(later: float) -> int:
        return max(0, int(use.cycles(later) + 1e-6) - flown)

    found: dict[tuple[str, int], tuple[str, float, str]] = {}
    for module in engine.modules:
        part = part_removal(module, flying.rating, day, until, flying.hours_per_cycle)
        serial = _limiting_part(module, flying.rating, day)
        found["parts", module.spec.slot] = (part.cause, float(part.cycles), serial)
        watch = watch_removal(module, until)
        found["finding", module.spec.slot] = ("finding", float(watch.cycles), "")
    if engine.modules:
        margin = margin_cycles(engine, flying)
        cycles = float(max(0, math.ceil(margin - 1e-6))) if margin < FAR else float(FAR)
        found["margin", -1] = ("margin", cycles, "")
    return found


def _limiting_part(module: ModuleState, rating: int, day: float) -> str:
    """Return the serial of the part with the least cycles left under the limits last known."""
    del day
    if not module.parts:
        return ""
    return min(
        module.parts, key=lambda p: (min(p.left(module.run, rating, e) for e in p.epochs) if p.known else 0, p.serial)
    ).serial


def _dated(view: Picture, engine: EngineState, tail: str, use: Usage) -> list[Planned]:
    """Return the ends that a calendar day brings: lease-in, return of the tail, exit."""
    ends: list[tuple[str, float]] = []
    if engine.lease_end < math.inf:
        ends.append(("lease_end", engine.lease_end))
    lease = view.lease_of(tail)
    if lease is not None and lease.after_return == "leave":
        ends.append(("return", lease.return_day))
    exit_day = view.tails[tail].row.exit_day
    if exit_day is not None:
        ends.append(("exit", exit_day))
    return [Planned(cause, -1, use.cycles(day), max(day, use.since), "") for cause, day in ends if day < _LAST_DAY]


def _chances(view: Picture, engine: EngineState, tail: str) -> tuple[Chance, ...]:
    environment = view.tails[tail].flying.environment
    found = []
    for module in engine.modules:
        for one in module.hazards():
            scale = hazard.scale_in(environment, one.scale, one.exponent)
            if scale < math.inf:
                found.append(Chance(one.cause, module.spec.slot, one.shape, scale, one.hours, module.age(one)))
        early = module.spec.early
        if early is not None and module.csb < early.ends_after:
            found.append(
                Chance(
                    "early", module.spec.slot, 1.0, 1.0, False, float(module.csb), early.probability, early.ends_after
                )
            )
    return tuple(found)


def gathered(one: Chance, cycles: Floats, hours: Floats) -> Floats:
    """Return the hazard that a chance cause gathers over so many more cycles or hours."""
    if one.ends_after:
        # a chance spread evenly over the first cycles after a build, given survival so far
        share = one.probability / one.ends_after
        after = share * np.minimum(one.age + cycles, one.ends_after)
        gone = share * one.age
        return np.asarray(-np.log1p(-(after - gone) / (1.0 - gone)))
    more = hours if one.hours else cycles
    return np.asarray(((one.age + more) / one.scale) ** one.shape - (one.age / one.scale) ** one.shape)


def first_removal(one: Ahead, months: Months) -> FirstRemoval:
    """Return the law of the first removal over some months."""
    edges, stop = months.edges, one.planned_day
    # in the month in which the planned cause falls, hazards gather up to that day only
    cycles, hours = months.flown_until(one.use, stop)
    rows = [gathered(chance, cycles, hours) for chance in one.chances]
    hazards = np.array(rows) if rows else np.zeros((1, edges.size))
    alive = np.exp(-hazards.sum(axis=0))
    steps = np.diff(hazards, axis=1)
    total = steps.sum(axis=0)
    share = np.divide(steps, total, out=np.zeros_like(steps), where=total > 0.0)
    names = [(chance.cause, chance.slot) for chance in one.chances]
    by_month = (share * (alive[:-1] - alive[1:]))[: len(rows)].T
    if one.planned and stop < edges[-1]:
        column = np.zeros((len(months), 1))
        column[max(0, int(np.searchsorted(edges, stop, side="right")) - 1), 0] = alive[-1]
        names.append((one.planned[0].cause, one.planned[0].slot))
        by_month = np.hstack([by_month, column])
    return FirstRemoval(tuple(names), by_month, np.where(edges[1:] >= stop, 0.0, alive[1:]))


def quantile_days(
    chances: Sequence[Chance], use: Usage, *, stop: float = math.inf, levels: Sequence[float] = LEVELS
) -> tuple[float, ...]:
    """Return the days by which the causes together have struck with each chance; ``stop`` cuts them off, inf is
    never.

    Days are read from a grid of about two weeks, the hazard gathered taken as even inside a step.
    """
    last = min(stop, _LAST_DAY)
    if last <= use.since:
        return tuple(last for _ in levels)
    days = np.linspace(use.since, last, max(2, math.ceil((last - use.since) / _FINE_DAYS) + 1))
    cycles = np.array([use.cycles(day) for day in days])
    hours = np.array([use.hours(day) for day in days])
    total = np.zeros(days.size)
    for one in chances:
        total = total + gathered(one, cycles, hours)
    found = []
    for level in levels:
        wanted = -math.log1p(-level)
        if total[-1] < wanted:
            found.append(stop)
            continue
        found.append(float(np.interp(wanted, total, days)))
    return tuple(found)


def month_edges(as_of: dt.date, months: int) -> Floats:
    """Return the days at which months begin and end, shape (months + 1,): the first starts on the as-of date."""
    starts = []
    for number in range(1, months + 1):
        year, month = divmod(as_of.year * 12 + as_of.month - 1 + number, 12)
        starts.append(float((dt.date(year, month + 1, 1) - as_of).days))
    return np.array([0.0, *starts])
