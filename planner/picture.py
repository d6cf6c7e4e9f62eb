"""The fleet as a planner sees it on a day: the simulation's own states, set out and not yet flown.

What the simulation draws in secret (failure dates, turn times, findings) is in these states too, and nothing that
reads a picture may look at it: plans use limits, measured losses and expected curves only.
"""

from __future__ import annotations

import copy
import difflib
from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property

from planner.ledger import Ledger
from planner.planned_use import PlannedUse
from sim import start
from sim.aircraft import AircraftProcess
from sim.errors import RequestError
from sim.fleet import Engine, Fleet, Lease, Strategy
from sim.removal import Removal, planned_removal
from sim.setting_out import set_out
from sim.spec import Setup, setup
from sim.state import EngineState, Flying, ModuleState
from sim.world import World

DAYS_PER_YEAR = 365.25


@dataclass(frozen=True, kw_only=True)
class Picture:
    """A fleet set out on a day. ``world`` holds its states; ``day`` counts from the as-of date."""

    fleet: Fleet
    setup: Setup
    world: World
    day: float

    @cached_property
    def engines(self) -> dict[str, EngineState]:
        return {state.serial: state for state in self.world.all_engines}

    @cached_property
    def modules(self) -> dict[str, ModuleState]:
        return {state.serial: state for state in self.world.all_modules}

    @cached_property
    def tails(self) -> dict[str, AircraftProcess]:
        return {process.row.tail: process for process in self.world.aircraft}

    @cached_property
    def engine_rows(self) -> dict[str, Engine]:
        return {row.engine_serial: row for row in self.fleet.engines}

    @cached_property
    def uses(self) -> dict[str, PlannedUse]:
        return {row.tail: PlannedUse(self.fleet, row, season=self.setup.season) for row in self.fleet.aircraft}

    @cached_property
    def ledger(self) -> Ledger:
        return Ledger(self.setup)

    def engine(self, serial: str) -> EngineState:
        """Return an engine's state. Raises RequestError for a serial that the records do not hold."""
        if serial not in self.engines:
            near = nearest(serial, tuple(self.engines))
            raise RequestError(
                "engine", serial, "an engine serial of the records", f"did you mean {near}?" if near else ""
            )
        return self.engines[serial]

    def strategy(self, kind: str) -> Strategy:
        """Return the goals that plans of an engine type are made for."""
        return self.setup.strategy[kind]

    def lease_of(self, tail: str) -> Lease | None:
        return next((lease for lease in self.fleet.leases if lease.tail == tail), None)

    def discount(self, day: float) -> float:
        """Return what a dollar of a day is worth on the as-of date."""
        return float((1.0 + self.fleet.settings.discount_rate_frac) ** (-day / DAYS_PER_YEAR))

    def price(self, *key: str, day: float) -> float:
        """Return the escalated price in USD of one unit of a catalogue item on a day, not discounted."""
        number = self.setup.catalogue.number(*key)
        self.ledger.refresh()
        return self.ledger.unit_price(number, day)


def picture(fleet: Fleet, *, day: float = 0.0) -> Picture:
    """Return the fleet set out on the as-of date; ``day`` later than 0 lets shelves and shops run up to then, unflown.

    Raises RequestError when the fleet has no strategy to read goals from.
    """
    if not fleet.strategies:
        raise RequestError("strategies", "no row", "at least one strategy", "add a row to strategies.csv")
    names = [row.strategy for row in fleet.strategies]
    chosen = next((row.strategy for row in fleet.strategies if row.way_out == "cheapest"), names[0])
    horizon = max(fleet.settings.horizon_years * DAYS_PER_YEAR, day + 1.0)
    ready = setup(fleet, chosen, horizon_days=horizon)
    world = World(ready, start.names(ready), seed=0, run=0)
    set_out(world)
    made = Picture(fleet=fleet, setup=ready, world=world, day=day)
    if day > 0.0:
        world.env.run(until=day)
        for tail, process in made.tails.items():
            process.flying = flying_on(made, tail, day=day)
    return made


def flying_on(view: Picture, tail: str, *, day: float) -> Flying:
    """Return how a tail is planned to fly on a day."""
    process, stretch = view.tails[tail], view.uses[tail].at_day(day)
    rating = process.spec.ratings.index(stretch.rating)
    return process.flying._replace(rating=rating, hours_per_cycle=stretch.hours_per_cycle)


def cloned(engine: EngineState) -> EngineState:
    """Return a copy of an engine whose modules can be flown, restored and exchanged without touching the picture."""
    twin = copy.copy(engine)
    twin.modules = [cloned_module(module) for module in engine.modules]
    return twin


def cloned_module(module: ModuleState) -> ModuleState:
    """Return a copy of a module; its parts are shared until they are replaced, since flying does not change them."""
    twin = copy.copy(module)
    twin.run, twin.budgets, twin.draws = list(module.run), list(module.budgets), list(module.draws)
    twin.parts = list(module.parts)
    return twin


def flown_to(view: Picture, engine: EngineState, tail: str, *, cycles: int) -> EngineState:
    """Return an engine as it will be after so many more cycles on a tail, ratings and use as planned."""
    twin, use, process = cloned(engine), view.uses[tail], view.tails[tail]
    done = 0
    for stretch, after in zip(use.stretches, (*use.stretches[1:], None), strict=True):
        last = cycles if after is None else min(cycles, int(after.cycles + 1e-6))
        if last > done:
            rating = process.spec.ratings.index(stretch.rating)
            twin.book(last - done, process.flying._replace(rating=rating, hours_per_cycle=stretch.hours_per_cycle))
            done = last
    return twin


def foreseen(view: Picture, engine: EngineState, tail: str, *, day: float = 0.0) -> Removal:
    """Return the first removal of an engine on a tail that can be foreseen, in cycles from ``day`` on.

    ``engine`` is in its state of that day. Where the tail's rating or use changes first, the engine is flown up to the
    change and looked at again.
    """
    use, process = view.uses[tail], view.tails[tail]
    twin, done = engine, 0
    start = use.cycles(day)
    first = use.at_day(day)
    stretches = use.stretches[use.stretches.index(first) :]
    for stretch, after in zip(stretches, (*stretches[1:], None), strict=True):
        rating = process.spec.ratings.index(stretch.rating)
        flying = process.flying._replace(rating=rating, hours_per_cycle=stretch.hours_per_cycle)
        now = max(start + done, stretch.cycles)
        removal = planned_removal(twin, flying, use.day(now), _cycles_until(use, now))
        left = removal.cycles if after is None else int(after.cycles - start + 1e-6) - done
        if after is None or removal.cycles <= left:
            return removal._replace(cycles=removal.cycles + done)
        twin = cloned(twin)
        twin.book(left, flying)
        done += left
    raise AssertionError("the last stretch has no end")


def _cycles_until(use: PlannedUse, now: float) -> Callable[[float], int]:
    return lambda later: max(0, int(use.cycles(later) - now + 1e-6))


def nearest(word: str, known: tuple[str, ...]) -> str:
    """Return the known word that is most like the one asked for, or an empty string."""
    found = difflib.get_close_matches(word, known, n=1, cutoff=0.5)
    return found[0] if found else ""
