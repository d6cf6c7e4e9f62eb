"""One run: ``simulate(setup, known, seed, run)`` lets the fleet live from the as-of date to the horizon.

The world owns what aircraft share: pools, shops, teams, the lease market, and the work that is under way. Whoever
arrives anywhere learns its start from sim/shop.py in closed form, so a stay is one timeout with one callback.
"""

from __future__ import annotations

import gc
import math
from collections.abc import Callable

from simpy import Environment
from simpy.events import Timeout

from sim import start
from sim.aircraft import AircraftProcess
from sim.draws import normal
from sim.events import KIND, Log
from sim.matching import Matching
from sim.pool import EnginePool, ModulePool
from sim.removal import Removal
from sim.renting import Renting
from sim.returns import settle
from sim.setting_out import set_out
from sim.shop import Bays, Capacity, capacity
from sim.spec import Setup
from sim.start import Names
from sim.state import EngineState, ModuleState
from sim.strategy import decide
from sim.valuation import value_engines, value_module
from sim.view import Decision, Scope, View
from sim.visit import Bench

_INDUCTION, _RELEASE, _OFF, _ON, _POOL, _DECISION = (
    KIND[k] for k in ("induction", "release", "module_off", "module_on", "pool", "decision")
)
_KEEPING, _MODULE_IN, _MODULE_OUT, _VALUE = (
    KIND[k] for k in ("keeping", "module_induction", "module_release", "value")
)


class World:
    """Everything that a run changes."""

    def __init__(self, setup: Setup, known: Names, *, seed: int, run: int) -> None:
        self.setup, self.known = setup, known
        self.env = Environment()
        self.log = Log()
        self.season = setup.season
        self.end_days = setup.horizon_days
        self.seed, self.run = seed, run
        self.module_luck, self.engine_luck, self.tail_luck = start.luck(known, seed=seed, run=run)
        self.catalogue = setup.catalogue
        self.item: Callable[..., int] = self.catalogue.number
        self.engine_rows = {t.engine_type: t for t in setup.fleet.engine_types}
        self.fuel_item = {name: self.item("fuel", name) for name in setup.types}
        settings = setup.fleet.settings
        self.rate_frac = settings.discount_rate_frac + settings.spare_keeping_frac_per_year
        self.engine_pools = {name: EnginePool() for name in setup.types}
        self.module_pools = {name: ModulePool() for name in setup.types}
        self.engine_shops: dict[str, list[Capacity]] = {
            name: [capacity(s.per_month, s.bays) for s in shops] for name, shops in setup.shops.items()
        }
        self.module_shops: dict[str, list[Capacity]] = {
            name: [capacity(s.modules_per_month, s.module_bays) for s in shops] for name, shops in setup.shops.items()
        }
        self.teams = [(team, Bays(team.jobs_at_a_time)) for team in setup.teams]
        self.tail_number = {row.tail: i for i, row in enumerate(setup.fleet.aircraft)}
        self.aircraft: list[AircraftProcess] = []
        self.under_way: dict[str, tuple[float, Callable[[], None]]] = {}
        self.waiting_modules: list[tuple[float, EngineState, Removal, AircraftProcess]] = []
        self.gone: list[str] = []
        self.bench = Bench(self)
        self.matching = Matching(self)
        self.renting = Renting(self)

    # off the wing ------------------------------------------------------------------------------------------------

    def on_wing_days(self, aircraft: AircraftProcess, engine: EngineState, removal: Removal) -> float:
        """Exchange a module on the wing if that is the decision; return the days it takes, else 0."""
        if removal.slot < 0 or engine.leased or engine.spec.modules[removal.slot].place != "wing":
            return 0.0
        decision = self._decide(aircraft, engine, removal)
        if decision.way != "exchange":
            return 0.0
        now = self.env.now
        ready = self._team_job(engine, decision, now)
        for slot, serial in decision.swaps:
            self._swap(engine, slot, serial, removal, aircraft)
        return ready - now

    def send_away(self, aircraft: AircraftProcess, engine: EngineState, removal: Removal) -> None:
        """Decide what becomes of an engine that has come off, and set it going."""
        if engine.leased or removal.cause == "lease_end":
            self.renting.give_back(engine)
            return
        if removal.cause == "planned" and removal.slot < 0:
            removal = self.matching.planned_cause(aircraft, engine)
        self.carry_out(aircraft, engine, removal, self._decide(aircraft, engine, removal))

    def carry_out(self, aircraft: AircraftProcess, engine: EngineState, removal: Removal, decision: Decision) -> None:
        """Set going what was decided for an engine off the wing."""
        if decision.way == "wait":
            self._wait_for_module(aircraft, engine, removal)
        elif decision.way == "exchange":
            self._exchange(aircraft, engine, removal, decision)
        else:
            self.to_shop(engine, decision.shop, decision.scope, removal)

    def _decide(self, aircraft: AircraftProcess, engine: EngineState, removal: Removal) -> Decision:
        view = self.matching.view(aircraft, engine, removal)
        decision = decide(view, self.setup.strategy[engine.spec.engine_type], self.catalogue, rate_frac=self.rate_frac)
        self._log_decision(engine, view, decision)
        return decision

    def _log_decision(self, engine: EngineState, view: View, decision: Decision) -> None:
        names = engine.spec.modules
        if decision.way == "exchange":
            what = "exchange " + ", ".join(f"{names[slot].module} for {serial}" for slot, serial in decision.swaps)
        elif decision.way == "wait":
            what = f"wait for {names[view.slot].module}"
        else:
            what = f"{decision.scope.visit} visit"
        costs = "; ".join(f"{name} {usd / 1e6:.3f} M USD" for name, usd in decision.costs)
        self.log.fact(_DECISION, self.env.now, engine.serial, detail=f"{what} [{costs}]" if costs else what)

    # shops -------------------------------------------------------------------------------------------------------

    def to_shop(
        self,
        engine: EngineState,
        number: int,
        scope: Scope,
        removal: Removal,
        swaps: tuple[tuple[int, str], ...] = (),
        serve: AircraftProcess | None = None,
    ) -> None:
        """Send an engine to a shop: transport, queue, work, transport; then to the pool."""
        kind = engine.spec.engine_type
        shop = self.setup.shops[kind][number]
        law = shop.turn.get(scope.visit) or shop.turn[next(iter(shop.turn))]
        uniform = self.engine_luck.draw("turn", engine.index, engine.visits)
        engine.visits += 1
        stay = law.drawn(uniform, normal(uniform))
        begin = self.engine_shops[kind][number].start(self.env.now + shop.transport_days, stay)
        released = begin + stay
        taken = [(slot, self._take_module(kind, serial)) for slot, serial in swaps]
        serve_rating = serve.flying.rating if serve else 0

        def exchange(_: object) -> None:
            for slot, module in taken:
                self._put_in(engine, slot, module, removal, serve_rating)

        def finish() -> None:
            self.bench.work_on(engine, scope, day=released)

        if taken:
            self.at(begin, exchange)
        finish = once(finish)
        if begin <= self.end_days:
            self.bench.book_visit(engine, shop, scope, begin=begin, released=released, removal=removal)
            for slot, _ in taken:
                name = engine.spec.modules[slot].module
                self.log.cost(begin, self.item("exchange", kind, name), 1.0, engine.serial, name, booked=begin)
            self.under_way[engine.serial] = (begin, finish)
        self.log.fact(_INDUCTION, begin, engine.serial, shop.shop, scope.visit)

        def back(_: object) -> None:
            self.under_way.pop(engine.serial, None)
            finish()
            self.log.fact(_RELEASE, released, engine.serial, shop.shop, scope.visit)
            self.offer(engine)

        self.at(released + shop.transport_days, back)

    def at(self, day: float, act: Callable[[object], None]) -> None:
        """Do something on a day (nothing when it lies beyond the study)."""
        if day <= self.end_days:
            wait = Timeout(self.env, max(0.0, day - self.env.now))
            assert wait.callbacks is not None
            wait.callbacks.append(act)

    def repair(self, module: ModuleState, removal: Removal, rating: int) -> None:
        """Send a module to the shop that expects it back first; then to the shelf."""
        kind = module.spec.engine_type
        shops, books = self.setup.shops[kind], self.module_shops[kind]
        if not shops:
            return
        mean = module.spec.repair.mean_days
        number = min(
            range(len(shops)),
            key=lambda i: (
                books[i].expected_start(self.env.now + shops[i].transport_days, mean) + shops[i].transport_days,
                i,
            ),
        )
        shop = shops[number]
        uniform = self.module_luck.draw("repair", module.index, module.repairs)
        stay = module.spec.repair.drawn(uniform, normal(uniform))
        begin = books[number].start(self.env.now + shop.transport_days, stay)
        level, replace = self.bench.module_scope(module, removal, rating, self.setup.strategy[kind].build_goal_cycles)

        def finish() -> None:
            self.bench.work_on_module(module, level, replace, day=begin + stay, rating=rating)

        finish = once(finish)
        if begin <= self.end_days:
            self.bench.book_repair(module, shop, level, replace, begin=begin, released=begin + stay)
            self.under_way[module.serial] = (begin, finish)
        self.log.fact(_MODULE_IN, begin, module.serial, shop.shop, str(level))
        ready = begin + stay + shop.transport_days
        expected = books[number].expected_start(self.env.now + shop.transport_days, mean) + mean + shop.transport_days
        self.module_pools[kind].coming[module.serial] = (module.spec.slot, expected)

        def back(_: object) -> None:
            self.under_way.pop(module.serial, None)
            finish()
            self.log.fact(_MODULE_OUT, begin + stay, module.serial, shop.shop)
            self.shelve(module)

        self.at(ready, back)

    # exchanges ---------------------------------------------------------------------------------------------------

    def _exchange(self, aircraft: AircraftProcess, engine: EngineState, removal: Removal, decision: Decision) -> None:
        if any(engine.spec.modules[slot].place == "shop" for slot, _ in decision.swaps):
            self.to_shop(engine, decision.shop, decision.scope, removal, decision.swaps, aircraft)
            return
        ready = self._team_job(engine, decision, self.env.now)
        for slot, serial in decision.swaps:
            self._swap(engine, slot, serial, removal, aircraft)
        self.at(ready, lambda _: self.offer(engine))

    def _team_job(self, engine: EngineState, decision: Decision, now: float) -> float:
        """Call a team out; return the day on which the exchange is done."""
        spec = engine.spec
        days = sum(spec.modules[slot].exchange_days for slot, _ in decision.swaps)
        done = now + days
        if self.teams:
            number = self.matching.team_for(spec.engine_type, now, days)
            team, jobs = self.teams[number]
            done = jobs.start(now + team.call_out_days, days) + days
            self.log.cost(now, self.item("call_out", team.team, spec.engine_type), 1.0, engine.serial, team.team)
        for slot, _ in decision.swaps:
            name = spec.modules[slot].module
            self.log.cost(now, self.item("exchange", spec.engine_type, name), 1.0, engine.serial, name)
        return done

    def _swap(self, engine: EngineState, slot: int, serial: str, removal: Removal, aircraft: AircraftProcess) -> None:
        self._put_in(engine, slot, self._take_module(engine.spec.engine_type, serial), removal, aircraft.flying.rating)

    def _put_in(self, engine: EngineState, slot: int, module: ModuleState, removal: Removal, rating: int) -> None:
        old = engine.modules[slot]
        engine.modules[slot] = module
        now = min(self.env.now, self.end_days)
        self.log.fact(_OFF, now, old.serial, engine.serial, removal.cause, old.csr, old.hsr)
        self.log.fact(_ON, now, module.serial, engine.serial, "", module.csr, module.hsr)
        self.bench.built_in(module)
        self.repair(old, removal._replace(slot=slot), rating)

    def _take_module(self, kind: str, serial: str) -> ModuleState:
        module = self.module_pools[kind].take(serial)
        since = self.matching.shelf_since.pop(serial, 0.0)
        self._keeping(kind, module.spec.module, module.serial, since)
        return module

    def _wait_for_module(self, aircraft: AircraftProcess, engine: EngineState, removal: Removal) -> None:
        """Keep the engine until the module comes or the longest wait is over, then decide anew."""
        entry = (self.env.now, engine, removal, aircraft)
        self.waiting_modules.append(entry)

        def give_up(_: object) -> None:
            if entry in self.waiting_modules:
                self.waiting_modules.remove(entry)
                view = self.matching.view(aircraft, engine, removal)._replace(coming=())
                decision = decide(
                    view, self.setup.strategy[engine.spec.engine_type], self.catalogue, rate_frac=self.rate_frac
                )
                self._log_decision(engine, view, decision)
                self.carry_out(aircraft, engine, removal, decision)

        self.at(self.env.now + self.setup.strategy[engine.spec.engine_type].wait_for_module_days, give_up)

    # pools -------------------------------------------------------------------------------------------------------

    def shelve(self, module: ModuleState) -> None:
        """Put a module on the shelf; whoever waits for one decides anew."""
        kind = module.spec.engine_type
        pool = self.module_pools[kind]
        pool.coming.pop(module.serial, None)
        pool.modules.append(module)
        self.matching.shelf_since[module.serial] = self.env.now
        self.log.fact(_POOL, self.env.now, module.serial, "", module.spec.module)
        for entry in list(self.waiting_modules):
            _, engine, removal, aircraft = entry
            if engine.spec.engine_type == kind and removal.slot == module.spec.slot:
                decision = self._decide(aircraft, engine, removal)
                if decision.way != "wait":
                    self.waiting_modules.remove(entry)
                    self.carry_out(aircraft, engine, removal, decision)

    def offer(self, engine: EngineState) -> None:
        """Give a ready engine to whoever waits longest and may fly it, else put it into the pool."""
        if engine.lease_end <= self.env.now:
            self.renting.give_back(engine)
            return
        pool = self.engine_pools[engine.spec.engine_type]
        for entry in pool.waiting:
            _, _, position, aircraft = entry
            if self.matching.fit_value(aircraft, position, engine) < math.inf:
                pool.waiting.remove(entry)
                aircraft.receive(position, engine)
                return
        pool.engines.append(engine)
        engine.pool_day = self.env.now
        self.log.fact(_POOL, self.env.now, engine.serial)
        self.matching.spare_came(engine)

    def find_spare(self, aircraft: AircraftProcess, position: int) -> EngineState | None:
        """Take the matching spare from the pool, or None."""
        pool = self.engine_pools[aircraft.row.engine_type]
        engine = pool.take(lambda e: self.matching.fit_value(aircraft, position, e))
        if engine is not None:
            self._keeping(engine.spec.engine_type, "engine", engine.serial, engine.pool_day)
        return engine

    def _keeping(self, kind: str, what: str, serial: str, since: float) -> None:
        days = min(self.env.now, self.end_days) - since
        if days > 0.0:
            self.log.span(_KEEPING, since, since + days, self.item("keeping", kind, what), days, serial)

    def wait_for_engine(self, aircraft: AircraftProcess, positions: list[int]) -> None:
        pool = self.engine_pools[aircraft.row.engine_type]
        for position in positions:
            pool.ask(self.env.now, aircraft, position)
        self.renting.look_out(aircraft)

    def stop_waiting(self, aircraft: AircraftProcess) -> None:
        self.engine_pools[aircraft.row.engine_type].withdraw(aircraft)

    # leaving -----------------------------------------------------------------------------------------------------

    def settle_return(self, aircraft: AircraftProcess) -> bool:
        """Settle a lease's return; return whether the aircraft leaves the fleet."""
        return settle(self, aircraft)

    def aircraft_left(self, aircraft: AircraftProcess) -> None:
        """Take the engines of an aircraft that leaves out of the books: owned ones become spares, leased ones go."""
        for position, engine in enumerate(aircraft.engines):
            aircraft.engines[position] = None
            if engine is None:
                continue
            if engine.leased:
                self.renting.give_back(engine)
            elif engine.owner in self.setup.lessors:
                self.gone.append(engine.serial)
            else:
                self.offer(engine)

    # ends --------------------------------------------------------------------------------------------------------

    def close(self) -> None:
        """Bring every count to the last day, then value what is left."""
        for aircraft in self.aircraft:
            aircraft.close()
        for kind, pool in self.engine_pools.items():
            for engine in pool.engines:
                self._keeping(kind, "engine", engine.serial, engine.pool_day)
        for kind, shelf in self.module_pools.items():
            for module in shelf.modules:
                self._keeping(
                    kind, module.spec.module, module.serial, self.matching.shelf_since.get(module.serial, 0.0)
                )
        self.renting.close()
        self.value("end", self.end_days)

    def sweep(self, day: float) -> None:
        """Value the fleet on a day inside the study; what was flown is booked, nothing else moves."""
        for aircraft in self.aircraft:
            aircraft.book_now()
        self.value("end", day)

    def value(self, end: str, day: float) -> None:
        """Write what every serial holds on a day; work inducted by then counts as done (it is booked in full)."""
        for begin, finish in list(self.under_way.values()):
            if begin <= day:
                finish()
        engines = [(e, self.matching.rating_of(e)) for e in self.all_engines if e.serial not in self.gone]
        value_engines(self.log, engines, day=day, end=end, catalogue=self.catalogue, lessors=self.setup.lessors)
        inside = {m.serial for e in self.all_engines for m in e.modules}
        for module in self.all_modules:
            if module.serial not in inside:
                value_module(
                    self.log,
                    module,
                    day=day,
                    end=end,
                    rating=self.matching.default_rating(module.spec.engine_type),
                    catalogue=self.catalogue,
                    lessors=self.setup.lessors,
                )
        for kind, what, count in self.stock:
            item = self.item("stock", end, kind, what)
            self.log.rows.append((_VALUE, day, day, day, item, float(count), f"{kind} {what}", "", end, 0, 0.0))

    all_engines: list[EngineState]
    all_modules: list[ModuleState]
    stock: list[tuple[str, str, int]]


def once(act: Callable[[], None]) -> Callable[[], None]:
    """Return an action that happens at its first call only."""
    done: list[bool] = []

    def guarded() -> None:
        if not done:
            done.append(True)
            act()

    return guarded


def simulate(setup: Setup, known: Names, *, seed: int, run: int) -> Log:
    """Return the events of one run.

    ``setup`` and ``known`` come from sim/spec.py and sim/start.py and are shared by all runs of a study. The same seed
    and run number give the same luck under every strategy.
    """
    collecting = gc.isenabled()
    gc.disable()  # a run makes no garbage that matters before it ends; the collector would only walk live state
    try:
        world = World(setup, known, seed=seed, run=run)
        set_out(world)
        for aircraft in world.aircraft:
            world.env.process(aircraft.life())
        for day in setup.sweep_days:
            world.at(day, lambda _, day=day: world.sweep(day))  # type: ignore[misc]
        world.env.run(until=setup.horizon_days)
        world.close()
        return world.log
    finally:
        if collecting:
            gc.enable()
