"""What a run changes: engines, modules and parts as small mutable records, and how flying books into them.

Counts of cycles are integers. A part's cycles by rating are read off its module's running count, so that booking an
installation costs a few additions a module and none a part.
"""

from __future__ import annotations

import math
from typing import NamedTuple

from sim import hazard
from sim.spec import EarlySpec, HazardSpec, ModuleSpec, PartSpec, TypeSpec
from sim.wear import gained, integral


class Epoch(NamedTuple):
    """Limits of a part from a day on: cycles by rating (0: none published there), their common multiple, what one
    cycle at each rating uses of it, limits in hours and days (inf: none), and what set them."""

    day: float
    limits: tuple[int, ...]
    multiple: int
    units: tuple[int, ...]
    limit_hours: float
    limit_days: float
    directive: bool


def epoch(
    day: float,
    limits: tuple[int, ...],
    *,
    limit_hours: float = math.inf,
    limit_days: float = math.inf,
    directive: bool = False,
) -> Epoch:
    """Return an epoch; the multiple is the least common one of the limits, so that life stays in integers."""
    multiple = math.lcm(*(limit for limit in limits if limit)) if any(limits) else 1
    units = tuple(multiple // limit if limit else multiple + 1 for limit in limits)
    return Epoch(day, limits, multiple, units, limit_hours, limit_days, directive)


class Flying(NamedTuple):
    """How an engine is flown on an aircraft: rating number, wear factor (environment times derate), environment,
    hours a cycle, and the wash of the base as (gain, half-life, every, item) or None."""

    rating: int
    wear_factor: float
    environment: float
    hours_per_cycle: float
    wash: tuple[float, float, int, int] | None


class PartState:
    """One part: cycles by rating before it entered its module, and the module's running count at that moment."""

    __slots__ = (
        "builds",
        "epochs",
        "flown",
        "hours",
        "known",
        "made_day",
        "mark",
        "mark_hours",
        "owner",
        "serial",
        "spec",
    )

    def __init__(
        self,
        serial: str,
        spec: PartSpec,
        *,
        epochs: tuple[Epoch, ...],
        flown: tuple[int, ...],
        hours: float = 0.0,
        made_day: float = 0.0,
        owner: str = "",
        known: bool = True,
    ) -> None:
        self.serial, self.spec, self.epochs, self.owner, self.known = serial, spec, epochs, owner, known
        self.flown, self.hours, self.made_day = flown, hours, made_day
        self.mark: tuple[int, ...] = (0,) * len(flown)
        self.mark_hours = 0.0
        self.builds = 0

    def counts(self, run: list[int]) -> list[int]:
        """Return cycles by rating, now."""
        return [f + r - m for f, r, m in zip(self.flown, run, self.mark, strict=True)]

    def epoch_at(self, day: float) -> Epoch:
        current = self.epochs[0]
        for one in self.epochs[1:]:
            if one.day <= day:
                current = one
        return current

    def left(self, run: list[int], rating: int, at: Epoch) -> int:
        """Return cycles left at a rating under an epoch's limits, rounded down; negative once passed, 0 if unknown."""
        if not self.known or not at.limits[rating]:
            return 0
        if self.spec.most_restrictive:
            counts = self.counts(run)
            flown = [at.limits[i] for i, count in enumerate(counts) if count]
            return min([at.limits[rating], *flown]) - sum(counts)
        left = at.multiple
        for before, now, mark, unit in zip(self.flown, run, self.mark, at.units):  # noqa: B905 -- hot, equal by make
            left -= (before + now - mark) * unit
        return left // at.units[rating]

    def fraction_left(self, run: list[int], rating: int, day: float) -> float:
        """Return the share of life left at a rating, 0 to 1."""
        at = self.epoch_at(day)
        return max(0, self.left(run, rating, at)) / at.limits[rating] if at.limits[rating] else 0.0


class ModuleState:
    """One module: ages, wear (in units of its law), hazard budgets, and its parts."""

    __slots__ = (
        "budgets",
        "built",
        "csb",
        "csn",
        "csr",
        "draws",
        "early_at",
        "factor",
        "first_run",
        "hsb",
        "hsn",
        "hsr",
        "index",
        "left_rating",
        "left_value",
        "loss",
        "owner",
        "parts",
        "permanent",
        "repairs",
        "restorations",
        "run",
        "serial",
        "slow",
        "spec",
        "standard",
        "watch_cycles",
        "watch_day",
    )

    def __init__(self, serial: str, spec: ModuleSpec, *, index: int, ratings: int, owner: str, standard: str) -> None:
        self.serial, self.spec, self.index, self.owner, self.standard = serial, spec, index, owner, standard
        self.csn = self.csr = self.csb = 0
        self.hsn = self.hsr = self.hsb = 0.0
        self.run: list[int] = [0] * ratings
        self.parts: list[PartState] = []
        self.loss = 0.0
        self.permanent = 0.0
        self.factor = 1.0
        self.first_run = False
        self.budgets: list[float] = []
        self.draws: list[int] = []
        self.early_at = 0
        self.built = self.repairs = self.restorations = 0
        self.left_rating, self.left_value = -1, 0
        self.slow = False
        self.watch_cycles = -1
        self.watch_day = math.inf

    def hazards(self) -> tuple[HazardSpec, ...]:
        return self.spec.hazards[1 if self.first_run else 0]

    def age(self, one: HazardSpec) -> float:
        """Return the age on a hazard's clock, counted from where it says."""
        if one.hours:
            return (
                self.hsn if one.counted_from == "new" else self.hsr if one.counted_from == "restoration" else self.hsb
            )
        return self.csn if one.counted_from == "new" else self.csr if one.counted_from == "restoration" else self.csb

    def lost_degC(self, rating: int) -> float:
        """Return the margin that this module has lost, in degC at a rating."""
        return (self.loss + self.permanent) * self.spec.wear[rating].unit_degC

    def parts_changed(self) -> None:
        """Forget the life left that was remembered; call after any change of parts."""
        self.left_rating = -1
        self.slow = any(
            len(part.epochs) > 1 or part.epochs[0].limit_hours < math.inf or part.epochs[0].limit_days < math.inf
            for part in self.parts
        )

    def plain_left(self, rating: int) -> int:
        """Return the least cycles left over the parts at a rating under the limits first in force."""
        if self.left_rating != rating:
            run = self.run
            self.left_value = min((part.left(run, rating, part.epochs[0]) for part in self.parts), default=_NO_LIMIT)
            self.left_rating = rating
        return self.left_value

    def book(self, cycles: int, hours: float, flying: Flying) -> float:
        """Book cycles flown; return the integral of the lost margin's fuel share over them (fraction times cycles)."""
        spec, rating = self.spec, flying.rating
        law = spec.wear[rating]
        factor = flying.wear_factor * self.factor
        fuel = 0.0
        if law.fuel_frac_per_degC:
            lost = (self.loss + self.permanent) * cycles
            lost += factor * integral(law, self.csr, cycles, flying.hours_per_cycle)
            fuel = lost * law.unit_degC * law.fuel_frac_per_degC
        self.loss += factor * gained(law, self.csr, cycles, flying.hours_per_cycle)
        budgets = self.budgets
        for i, one in enumerate(self.hazards()):
            scale = hazard.scale_in(flying.environment, one.scale, one.exponent)
            age = self.age(one)
            step = hours if one.hours else cycles
            used = hazard.cumulative(age + step, one.shape, scale) - hazard.cumulative(age, one.shape, scale)
            budgets[i] = max(0.0, budgets[i] - used)
        self.csn += cycles
        self.csr += cycles
        self.csb += cycles
        self.hsn += hours
        self.hsr += hours
        self.hsb += hours
        self.run[rating] += cycles
        if self.left_rating == rating:
            self.left_value -= cycles
        else:
            self.left_rating = -1
        if self.watch_cycles >= 0:
            self.watch_cycles = max(0, self.watch_cycles - cycles)
        return fuel


_NO_LIMIT = 10**9


class EngineState:
    """One engine: its modules by slot, its counters, and where it is."""

    __slots__ = (
        "csb",
        "csn",
        "expected_off",
        "hsn",
        "index",
        "installed_day",
        "lease_end",
        "leased",
        "modules",
        "offset_degC",
        "owner",
        "pool_day",
        "serial",
        "since_cycles",
        "since_hours",
        "spec",
        "standard",
        "visits",
    )

    def __init__(self, serial: str, spec: TypeSpec, *, index: int, owner: str, standard: str) -> None:
        self.serial, self.spec, self.index, self.owner, self.standard = serial, spec, index, owner, standard
        self.modules: list[ModuleState] = []
        self.csn = self.csb = 0
        self.hsn = 0.0
        self.offset_degC = 0.0
        self.visits = 0
        self.leased = False
        self.lease_end = math.inf
        self.installed_day = 0.0
        self.since_cycles = 0
        self.since_hours = 0.0
        self.pool_day = 0.0
        self.expected_off = math.inf

    def margin_degC(self, rating: int) -> float:
        """Return the hot-day margin above zero at a rating, without wash gain."""
        lost = 0.0
        for module in self.modules:
            lost += (module.loss + module.permanent) * module.spec.wear[rating].unit_degC
        return self.spec.new_margin[rating] + self.offset_degC - lost

    def book(self, cycles: int, flying: Flying) -> float:
        """Book cycles flown on the wing; return the extra fuel in kg that wear has burnt."""
        hours = cycles * flying.hours_per_cycle
        share = 0.0
        for module in self.modules:
            share += module.book(cycles, hours, flying)
        self.csn += cycles
        self.csb += cycles
        self.hsn += hours
        self.since_cycles += cycles
        self.since_hours += hours
        return share * flying.hours_per_cycle * self.spec.fuel_kg_per_hour


def early_cycle(spec: EarlySpec | None, uniform: float, since_build: int) -> int:
    """Return the cycle since the build at which an early failure strikes, or 0 for none, given survival so far."""
    if spec is None or since_build >= spec.ends_after:
        return 0
    gone = spec.probability * since_build / spec.ends_after
    chance = (spec.probability - gone) / (1.0 - gone)
    if uniform >= chance:
        return 0
    return since_build + 1 + int(uniform / chance * (spec.ends_after - since_build))
