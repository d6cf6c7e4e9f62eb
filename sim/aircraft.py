"""One aircraft: it flies while all its positions are filled, and waits once for the first thing that stops it.

A looping process an aircraft, one timeout an installation. Time is counted in flown cycles of this aircraft and mapped
to a day through the season. A change from outside (an early pull, a leased engine called back, a day of valuation)
rings the bell: what was flown is booked and a new wait begins; the old wait's timeout finds its own bell rung and
does nothing.
"""

from __future__ import annotations

import math
from collections.abc import Generator
from typing import TYPE_CHECKING, Any, NamedTuple

from simpy.events import Event as Bell
from simpy.events import Timeout

from sim.events import KIND
from sim.fleet import Aircraft
from sim.removal import FAR, Removal, next_removal, planned_removal
from sim.state import EngineState, Flying
from sim.wear import derate_factor

if TYPE_CHECKING:
    from sim.world import World

_FLOWN, _DOWN, _WASH, _REMOVAL, _INSTALL = (KIND[k] for k in ("flown", "down", "wash", "removal", "install"))
_ENTRY, _EXIT, _RATING, _SHORTAGE, _RETURN = (KIND[k] for k in ("entry", "exit", "rating_change", "shortage", "return"))
_FEW_CYCLES = 1e-6  # a cycle counts as flown when this little is missing, against rounding of days


class Boundary(NamedTuple):
    """A dated change that is known: what happens to the aircraft on a day."""

    day: float
    what: str
    rating: str = ""
    hours_per_year: float = 0.0
    cycles_per_year: float = 0.0


def is_dated(engine: EngineState) -> bool:
    """Return whether a calendar day can end the installation, so that days on the ground move its cycles."""
    return engine.lease_end < math.inf or any(m.slow or m.watch_day < math.inf for m in engine.modules)


class AircraftProcess:
    """State and process of one tail."""

    __slots__ = (
        "bell",
        "boundaries",
        "cycles_per_year",
        "engines",
        "flying",
        "flying_since",
        "hours_per_year",
        "operating",
        "rating",
        "reference",
        "removals",
        "requests",
        "return_day",
        "row",
        "spec",
        "waiting_since",
        "world",
    )

    def __init__(self, world: World, row: Aircraft, boundaries: list[Boundary]) -> None:
        self.world, self.row = world, row
        self.spec = world.setup.types[row.engine_type]
        self.engines: list[EngineState | None] = [None] * row.positions
        self.removals: list[Removal | None] = [None] * row.positions
        self.boundaries = boundaries
        self.hours_per_year, self.cycles_per_year = row.hours_per_year, row.cycles_per_year
        self.rating = row.rating
        self.operating = True
        self.bell: Bell | None = None
        self.requests: list[tuple[str, int]] = []
        self.reference = 0.0
        self.flying_since = -1.0
        self.waiting_since = -1.0
        self.return_day = math.inf
        self.flying = self._flying()

    def _flying(self) -> Flying:
        row, world = self.row, self.world
        kind = world.engine_rows[row.engine_type]
        environment = world.setup.environment.get(row.base, 1.0)
        factor = derate_factor(
            reference_frac=kind.reference_derate_frac,
            average_frac=row.average_derate_frac,
            wear_frac_per_derate_frac=kind.wear_frac_per_derate_frac,
        )
        wash = world.setup.washes.get((row.engine_type, row.base))
        return Flying(
            self.spec.ratings.index(self.rating),
            environment * factor,
            environment,
            self.hours_per_year / self.cycles_per_year,
            (wash.gain_degC, wash.half_life_cycles, wash.every_cycles, world.item("wash", row.engine_type, row.base))
            if wash
            else None,
        )

    def until(self, day: float) -> int:
        """Return the whole cycles flown by a day if the aircraft flew from now on."""
        flown = (self.world.season.flown(day) - self.reference) * self.cycles_per_year
        return max(0, math.floor(flown + _FEW_CYCLES))

    # the process -------------------------------------------------------------------------------------------------

    def life(self) -> Generator[Bell, Any, None]:
        """The process: enter, fill the positions, fly to the next stop, act, again."""
        env, world = self.world.env, self.world
        if self.row.entry_day is not None and self.row.entry_day > 0.0:
            yield Timeout(env, self.row.entry_day)
            world.log.fact(_ENTRY, env.now, self.row.tail)
        while True:
            if self._leave_if_over():
                return
            if None in self.engines:
                yield from self._fill()
                continue
            self._take_off()
            stop = self._stop_day()
            self.bell = env.event()
            if stop < world.end_days:
                self._ring_at(stop, self.bell)
            yield self.bell
            self._land()
            for position in self._due():
                yield from self._remove(position)
            self._answer_requests()

    def _ring_at(self, day: float, bell: Bell) -> None:
        def ring(_: Bell) -> None:
            if not bell.triggered:
                bell.succeed()

        wait = Timeout(self.world.env, max(0.0, day - self.world.env.now))
        assert wait.callbacks is not None
        wait.callbacks.append(ring)

    def ring(self) -> None:
        """Wake the aircraft now."""
        if self.bell is not None and not self.bell.triggered:
            self.bell.succeed()

    def ask(self, what: str, position: int) -> None:
        """Ask the flying aircraft for something: ``pull`` or ``call_back`` an engine, or just ``book``."""
        self.requests.append((what, position))
        self.ring()

    # flying ------------------------------------------------------------------------------------------------------

    def _take_off(self) -> None:
        now = self.world.env.now
        self.reference = self.world.season.flown(now)
        self.flying_since = now
        for position, engine in enumerate(self.engines):
            if engine is not None and (self.removals[position] is None or is_dated(engine)):
                self.removals[position] = self._next(engine)

    def _next(self, engine: EngineState) -> Removal:
        found = next_removal(engine, self.flying, self.world.env.now, self.until)
        if engine.lease_end < math.inf:
            over = self.until(engine.lease_end)
            if over < found.cycles:
                found = Removal(over, "lease_end", -1)
        planned = planned_removal(engine, self.flying, self.world.env.now, self.until).cycles
        engine.expected_off = self.reference + planned / self.cycles_per_year
        return found

    def _stop_day(self) -> float:
        cycles = min(removal.cycles for removal in self.removals if removal is not None)
        day = math.inf
        if cycles < FAR:
            day = max(self.world.env.now, self.world.season.day(self.reference + cycles / self.cycles_per_year))
        if self.boundaries:
            day = min(day, max(self.boundaries[0].day, self.world.env.now))
        return day

    def _land(self) -> None:
        """Book what was flown since the last stop."""
        now = self.world.env.now
        cycles = self.until(now)
        if cycles:
            self._book(cycles, self.flying_since, now)
        self.flying_since = -1.0
        while self.boundaries and self.boundaries[0].day <= now:
            self._cross(self.boundaries.pop(0))

    def _book(self, cycles: int, since: float, now: float) -> None:
        world, flying = self.world, self.flying
        hours = cycles * flying.hours_per_cycle
        for position, engine in enumerate(self.engines):
            if engine is None:
                continue
            if flying.wash is not None and engine.modules:
                washes = (engine.csb + cycles) // flying.wash[2] - engine.csb // flying.wash[2]
                if washes:
                    world.log.span(_WASH, since, now, flying.wash[3], float(washes), engine.serial)
            fuel = engine.book(cycles, flying)
            item = world.fuel_item[self.spec.engine_type]
            world.log.span(_FLOWN, since, now, item, fuel, engine.serial, self.row.tail, self.rating, cycles, hours)
            removal = self.removals[position]
            if removal is not None:
                self.removals[position] = removal._replace(cycles=removal.cycles - cycles)

    def _due(self) -> list[int]:
        return [p for p, removal in enumerate(self.removals) if removal is not None and removal.cycles <= 0]

    def _cross(self, boundary: Boundary) -> None:
        """Change what a dated row says; what is flown from here on is counted anew."""
        world, now = self.world, self.world.env.now
        if boundary.what == "rating":
            self.rating = boundary.rating
            world.log.fact(_RATING, now, self.row.tail, detail=boundary.rating)
        elif boundary.what == "use":
            self.hours_per_year, self.cycles_per_year = boundary.hours_per_year, boundary.cycles_per_year
        elif boundary.what == "return":
            world.log.fact(_RETURN, now, self.row.tail, detail="")
            if world.settle_return(self):
                self.operating = False
        elif boundary.what == "exit":
            self.operating = False
        self.flying = self._flying()
        self.removals = [None] * len(self.engines)

    # off the wing ------------------------------------------------------------------------------------------------

    def _remove(self, position: int) -> Generator[Bell, Any, None]:
        """Take an engine off, or exchange on the wing what can be exchanged there."""
        removal, engine = self.removals[position], self.engines[position]
        if removal is None or engine is None or not self.operating:
            return
        world, now = self.world, self.world.env.now
        self._log_removal(engine, removal)
        self.removals[position] = None
        days = world.on_wing_days(self, engine, removal)
        if days > 0.0:
            self._down(now, now + days, "exchange on the wing")
            yield Timeout(world.env, days)
            return
        self.engines[position] = None
        world.send_away(self, engine, removal)

    def _log_removal(self, engine: EngineState, removal: Removal) -> None:
        name = self.spec.modules[removal.slot].module if removal.slot >= 0 else ""
        cause = removal.cause + (f" {name}" if name else "")
        self.world.log.fact(
            _REMOVAL, self.world.env.now, engine.serial, self.row.tail, cause, engine.since_cycles, engine.since_hours
        )

    def _answer_requests(self) -> None:
        requests, self.requests = self.requests, []
        for what, position in requests:
            engine = self.engines[position] if position >= 0 else None
            if engine is None or what == "book":
                continue
            removal = Removal(0, "planned" if what == "pull" else "lease_end", -1)
            self._log_removal(engine, removal)
            self.engines[position] = None
            self.removals[position] = None
            self.world.send_away(self, engine, removal)

    def _fill(self) -> Generator[Bell, Any, None]:
        """Fill the empty positions: from the pool at once, else wait; then change engines."""
        world, env = self.world, self.world.env
        missing = [p for p, engine in enumerate(self.engines) if engine is None]
        for position in missing:
            engine = world.find_spare(self, position)
            if engine is not None:
                self._hang(position, engine)
        if None in self.engines:
            yield from self._wait()
        if self.operating and self.spec.change_days > 0.0:
            days = self.spec.change_days * len(missing)
            self._down(env.now, env.now + days, "engine change")
            yield Timeout(env, days)

    def _wait(self) -> Generator[Bell, Any, None]:
        """Stand without an engine until every position has one (or the aircraft leaves)."""
        world, env = self.world, self.world.env
        self.waiting_since = env.now
        world.log.fact(_SHORTAGE, env.now, self.row.tail, detail="begin")
        world.wait_for_engine(self, [p for p, engine in enumerate(self.engines) if engine is None])
        while None in self.engines and self.operating:
            self.bell = env.event()
            if self.boundaries and self.boundaries[0].day < world.end_days:
                self._ring_at(self.boundaries[0].day, self.bell)
            yield self.bell
            self._answer_requests()
            while self.boundaries and self.boundaries[0].day <= env.now:
                self._cross(self.boundaries.pop(0))
        world.stop_waiting(self)
        world.log.fact(_SHORTAGE, env.now, self.row.tail, detail="end")
        self._down(self.waiting_since, env.now, "no engine")
        self.waiting_since = -1.0

    def _hang(self, position: int, engine: EngineState) -> None:
        world = self.world
        self.engines[position] = engine
        self.removals[position] = None
        engine.installed_day = world.env.now
        engine.since_cycles, engine.since_hours = 0, 0.0
        world.log.fact(_INSTALL, world.env.now, engine.serial, self.row.tail, str(position + 1))
        world.log.cost(
            world.env.now, world.item("engine_change", self.spec.engine_type), 1.0, engine.serial, self.row.tail
        )

    def receive(self, position: int, engine: EngineState) -> None:
        """Take an engine that the aircraft has waited for."""
        self._hang(position, engine)
        if None not in self.engines:
            self.ring()

    def _down(self, since: float, until: float, reason: str) -> None:
        """Write days lost, up to the end of the study."""
        days = min(until, self.world.end_days) - since
        if days > 0.0:
            item = self.world.item("downtime", self.spec.engine_type)
            self.world.log.span(_DOWN, since, since + days, item, days, self.row.tail, "", reason)

    # ends --------------------------------------------------------------------------------------------------------

    def _leave_if_over(self) -> bool:
        if self.operating:
            return False
        self.world.log.fact(_EXIT, self.world.env.now, self.row.tail)
        self.world.aircraft_left(self)
        return True

    def book_now(self) -> None:
        """Book what was flown so far without ending the wait: what stops the aircraft stays where it is."""
        if self.flying_since < 0.0:
            return
        now = self.world.env.now
        cycles = self.until(now)
        if cycles:
            self._book(cycles, self.flying_since, now)
            self.reference += cycles / self.cycles_per_year
            self.flying_since = now

    def close(self) -> None:
        """Book what is under way when the study ends: cycles flown, or days down."""
        now = self.world.end_days
        if not self.operating:
            return
        if self.flying_since >= 0.0:
            cycles = self.until(now)
            if cycles:
                self._book(cycles, self.flying_since, now)
        elif self.waiting_since >= 0.0:
            self._down(self.waiting_since, now, "no engine")
