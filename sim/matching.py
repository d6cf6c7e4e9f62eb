"""Who gets what: spares to aircraft, modules to engines, teams to jobs; and the view that a strategy is given."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from sim.fit_rules import FitPart, Offered, Receiver, mates_of, may_fit
from sim.removal import Removal, margin_now, planned_removal
from sim.spec import CHECK, RESTORATION
from sim.state import EngineState, Flying, ModuleState
from sim.view import ModuleView, PartView, ShopView, View

if TYPE_CHECKING:
    from sim.aircraft import AircraftProcess
    from sim.world import World


class Matching:
    """Choices by stated rules; ties go to the lower serial."""

    __slots__ = ("_flying_of", "_rating_of", "mates", "shelf_since", "world")

    def __init__(self, world: World) -> None:
        self.world = world
        self.shelf_since: dict[str, float] = {}
        self._flying_of: dict[str, Flying] = {}
        self._rating_of: dict[str, int] = {}
        self.mates = mates_of(world.setup.fleet.standards)

    # ratings -----------------------------------------------------------------------------------------------------

    def default_rating(self, kind: str) -> int:
        """Return the rating at which most aircraft of a type fly: what a shelf is valued at."""
        if kind not in self._rating_of:
            counts = [0] * len(self.world.setup.types[kind].ratings)
            for aircraft in self.world.aircraft:
                if aircraft.row.engine_type == kind:
                    counts[aircraft.flying.rating] += 1
            self._rating_of[kind] = counts.index(max(counts)) if counts else 0
        return self._rating_of[kind]

    def flew_on(self, engine: EngineState, flying: Flying) -> None:
        self._flying_of[engine.serial] = flying

    def rating_of(self, engine: EngineState) -> int:
        """Return the rating number that an engine is planned at: where it flies or last flew."""
        flying = self._flying_of.get(engine.serial)
        return flying.rating if flying else self.default_rating(engine.spec.engine_type)

    # spares ------------------------------------------------------------------------------------------------------

    def fit_value(self, aircraft: AircraftProcess, position: int, engine: EngineState) -> float:
        """Return how well a spare fits a tail (less is better; inf: it may not fly there)."""
        if engine.leased or not engine.modules:
            return math.inf
        flying = aircraft.flying
        for module in engine.modules:
            if any(not part.epochs[0].limits[flying.rating] for part in module.parts):
                return math.inf
        now = self.world.env.now
        planned = planned_removal(engine, flying, now, self._until(aircraft))
        if planned.cycles < 1:
            return math.inf
        if self.world.setup.strategy[engine.spec.engine_type].match == "first":
            return engine.pool_day
        return self._life_match(aircraft, position, engine, planned.cycles)

    def _life_match(self, aircraft: AircraftProcess, position: int, engine: EngineState, cycles: int) -> float:
        needed = self._until(aircraft)(aircraft.return_day) if aircraft.return_day < math.inf else 10**9
        # before a return the shortest life that is enough; else the longest
        value = float(cycles) if cycles >= needed else 1e6 + (needed if needed < 10**9 else 1e6) - cycles
        if aircraft.row.etops_minutes and self._weak_pair(aircraft, position, engine, cycles):
            value += 1e7
        return value

    def _weak_pair(self, aircraft: AircraftProcess, position: int, engine: EngineState, cycles: int) -> bool:
        settings = self.world.setup.fleet.settings
        for other_position, other in enumerate(aircraft.engines):
            if other is None or other_position == position or not other.modules:
                continue
            if engine.csb < settings.fresh_cycles and other.csb < settings.fresh_cycles:
                return True
            if cycles < settings.weak_cycles and self._weak(aircraft, other):
                return True
        return False

    def _weak(self, aircraft: AircraftProcess, engine: EngineState) -> bool:
        settings = self.world.setup.fleet.settings
        if margin_now(engine, aircraft.flying) < settings.weak_margin_degC:
            return True
        planned = planned_removal(engine, aircraft.flying, self.world.env.now, self._until(aircraft))
        return planned.cycles < settings.weak_cycles

    def _until(self, aircraft: AircraftProcess):  # type: ignore[no-untyped-def]
        season, now = self.world.season, self.world.env.now
        reference, cycles_per_year = season.flown(now), aircraft.cycles_per_year

        def until(day: float) -> int:
            return max(0, math.floor((season.flown(day) - reference) * cycles_per_year + 1e-6))

        return until

    def spare_came(self, engine: EngineState) -> None:
        """A spare lies idle: call a rented engine back, or bring forward the removal with least expected life left."""
        world = self.world
        if world.renting.call_back(engine.spec.engine_type):
            return
        ahead = world.setup.strategy[engine.spec.engine_type].plan_ahead_cycles
        if ahead <= 0:
            return
        best: tuple[float, str, AircraftProcess, int] | None = None
        flown = world.season.flown(world.env.now)
        for aircraft in world.aircraft:
            if aircraft.spec is not engine.spec or aircraft.flying_since < 0.0:
                continue
            for position, own in enumerate(aircraft.engines):
                if own is None or not own.modules:
                    continue
                left = (own.expected_off - flown) * aircraft.cycles_per_year
                if left <= ahead and (best is None or (left, own.serial) < best[:2]):
                    if self.fit_value(aircraft, position, engine) == math.inf:
                        continue
                    best = (left, own.serial, aircraft, position)
        if best is not None:
            best[2].ask("pull", best[3])

    def planned_cause(self, aircraft: AircraftProcess, engine: EngineState) -> Removal:
        """Return what a planned removal is planned for: the cause that was expected next."""
        planned = planned_removal(engine, aircraft.flying, self.world.env.now, self._until(aircraft))
        return Removal(0, planned.cause, planned.slot)

    # teams -------------------------------------------------------------------------------------------------------

    def team_for(self, kind: str, day: float, stay: float) -> int:
        """Return the number of the team that can start first among those that work on a type."""
        world = self.world
        able = [i for i, (team, _) in enumerate(world.teams) if not team.engine_types or kind in team.engine_types]
        able = able or list(range(len(world.teams)))
        return min(
            able, key=lambda i: (world.teams[i][1].expected_start(day + world.teams[i][0].call_out_days, stay), i)
        )

    # the view ----------------------------------------------------------------------------------------------------

    def view(self, aircraft: AircraftProcess, engine: EngineState, removal: Removal) -> View:
        """Return what a strategy may see of a removal."""
        world, flying, spec = self.world, aircraft.flying, engine.spec
        kind, now = spec.engine_type, world.env.now
        until = self._until(aircraft)
        pool = world.module_pools[kind]
        shelf = tuple(
            self._module_view(m, flying, now, until)
            for m in pool.modules
            if removal.slot in (-1, m.spec.slot) and self.may_mate(aircraft, engine, m)
        )
        slot = removal.slot
        least = world.bench.least_level(engine.modules[slot], removal) if slot >= 0 and engine.modules else CHECK
        if removal.cause == "early" and slot >= 0:
            least = max(CHECK, least)
        if removal.cause == "finding":
            least = RESTORATION
        spares = world.engine_pools[kind]
        return View(
            day=now,
            spec=spec,
            engine_serial=engine.serial,
            cause=removal.cause,
            slot=slot,
            least_level=least,
            modules=tuple(self._module_view(m, flying, now, until) for m in engine.modules),
            margin_degC=engine.margin_degC(flying.rating),
            rating=flying.rating,
            wear_factor=flying.wear_factor,
            hours_per_cycle=flying.hours_per_cycle,
            cycles_per_year=aircraft.cycles_per_year,
            pool=shelf,
            coming=tuple(sorted(pool.coming.values())),
            shops=self._shops(kind, now),
            team_start_day=self._team_start(kind, now),
            spares=len(spares.engines),
            waiting=len(spares.waiting) + 1,
            return_day=aircraft.return_day,
        )

    def _module_view(self, module: ModuleState, flying: Flying, now: float, until) -> ModuleView:  # type: ignore[no-untyped-def]
        rating = flying.rating
        unit = module.spec.wear[rating].unit_degC
        parts = []
        for part in module.parts:
            at = part.epoch_at(now)
            left = part.left(module.run, rating, at)
            for later in part.epochs:
                if later.day > now:
                    left = min(left, max(until(later.day), part.left(module.run, rating, later)))
            parts.append(
                PartView(part.spec.part_number, max(0, left), part.epochs[-1].limits[rating], part.spec.price_usd)
            )
        return ModuleView(
            module.serial,
            module.spec.slot,
            module.standard,
            tuple(parts),
            (module.loss + module.permanent) * unit,
            module.permanent * unit,
            module.csr,
            module.hsr,
            module.first_run,
        )

    def _shops(self, kind: str, now: float) -> tuple[ShopView, ...]:
        world = self.world
        views = []
        for i, shop in enumerate(world.setup.shops[kind]):
            mean = max((law.mean_days for law in shop.turn.values()), default=0.0)
            arrival = now + shop.transport_days
            views.append(
                ShopView(
                    shop.shop,
                    shop.transport_days,
                    world.engine_shops[kind][i].expected_start(arrival, mean),
                    world.module_shops[kind][i].expected_start(arrival, mean),
                    {visit: law.mean_days for visit, law in shop.turn.items()},
                )
            )
        return tuple(views)

    def _team_start(self, kind: str, now: float) -> float:
        world = self.world
        if not world.teams:
            return now
        team, jobs = world.teams[self.team_for(kind, now, 5.0)]
        return jobs.expected_start(now + team.call_out_days, 5.0)

    def may_mate(self, aircraft: AircraftProcess, engine: EngineState, module: ModuleState) -> bool:
        """Return whether a pool module may go on an engine as it will be flown: the six tests of sim/fit_rules.py."""
        flying, spec, row = aircraft.flying, engine.spec, aircraft.row
        now = self.world.env.now
        rating = flying.rating
        parts = []
        for part in module.parts:
            at = part.epoch_at(now)
            limit = at.limits[rating] or None
            number = part.spec.part_number
            belongs = (spec.engine_type, spec.modules[part.spec.slot].module)
            left = part.left(module.run, rating, at)
            parts.append(FitPart(part.serial, number, belongs, limit, left, part.known))
        rules = self.world.renting.exchange_rules
        offered = Offered(
            module_serial=module.serial,
            engine_type=module.spec.engine_type,
            module=module.spec.module,
            standard=module.standard,
            owner=module.owner,
            exchange_rule=rules.get(module.serial, ""),
            parts=tuple(parts),
        )
        receiver = Receiver(
            engine_serial=engine.serial,
            engine_type=spec.engine_type,
            module=module.spec.module,
            rating=spec.ratings[rating],
            ratings=spec.ratings,
            neighbours=tuple((m.spec.module, m.standard) for m in engine.modules),
            owner=engine.owner,
            exchange_rule=rules.get(engine.serial, ""),
            tail=row.tail,
            aircraft_type=row.engine_type,
            leaves_day=row.exit_day,
            etops_minutes=row.etops_minutes,
        )
        return not may_fit(offered, receiver, mates=self.mates, day=now)
