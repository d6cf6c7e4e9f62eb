"""Setting out: hang the fleet's states on a world as they are on the as-of date, shops and shelves included."""

from __future__ import annotations

from typing import TYPE_CHECKING

from sim import start
from sim.aircraft import AircraftProcess, Boundary
from sim.fleet import Aircraft, Engine, Module
from sim.removal import Removal
from sim.spec import CHECK, NONE, OVERHAUL, RESTORATION
from sim.state import EngineState, Flying, ModuleState
from sim.view import Scope

if TYPE_CHECKING:
    from sim.world import World

_LEVELS = {"": NONE, "check": CHECK, "restoration": RESTORATION, "overhaul": OVERHAUL}


def set_out(world: World) -> None:
    """Build every state of a run and value the fleet on the first day."""
    fleet = world.setup.fleet
    modules = {
        row.module_serial: start.module_state(row, world.setup, world.known, world.module_luck) for row in fleet.modules
    }
    inside = start.modules_of(fleet)
    engines = {row.engine_serial: start.engine_state(row, world.setup, world.known) for row in fleet.engines}
    for serial, rows in inside.items():
        found = {row.module: modules[row.module_serial] for row in rows}
        engines[serial].modules = [found[m.module] for m in engines[serial].spec.modules if m.module in found]
    world.all_engines = list(engines.values())
    world.all_modules = list(modules.values())
    for row in fleet.aircraft:
        world.aircraft.append(_aircraft(world, row))
    _hang(world, fleet.engines, engines)
    _settle(world, modules)
    _watch(world, modules)
    world.stock = _stock(world)
    _place_engines(world, fleet.engines, engines)
    _place_modules(world, fleet.modules, modules)
    world.value("start", 0.0)


def _aircraft(world: World, row: Aircraft) -> AircraftProcess:
    aircraft = AircraftProcess(world, row, boundaries(world, row))
    for lease in world.setup.fleet.leases:
        if lease.tail == row.tail and lease.after_return != "extend":
            aircraft.return_day = lease.return_day
    return aircraft


def boundaries(world: World, row: Aircraft) -> list[Boundary]:
    """Return the dated changes of a tail that are known, in order of day (ties: rating, use, return, exit)."""
    found = []
    if row.rating_until_day is not None and row.rating_after:
        found.append(Boundary(row.rating_until_day, "rating", rating=row.rating_after))
    for use in world.setup.fleet.utilisation:
        if use.tail in (row.tail, row.sub_fleet):
            found.append(
                Boundary(use.from_day, "use", hours_per_year=use.hours_per_year, cycles_per_year=use.cycles_per_year)
            )
    for lease in world.setup.fleet.leases:
        if lease.tail == row.tail:
            found.append(Boundary(lease.return_day, "return"))
    if row.exit_day is not None:
        found.append(Boundary(row.exit_day, "exit"))
    order = ("rating", "use", "return", "exit")
    return sorted(found, key=lambda one: (one.day, order.index(one.what)))


def _hang(world: World, rows: tuple[Engine, ...], engines: dict[str, EngineState]) -> None:
    by_tail = {aircraft.row.tail: aircraft for aircraft in world.aircraft}
    for row in rows:
        if row.tail and row.position is not None and row.place in ("wing", "leased_in") and row.tail in by_tail:
            aircraft = by_tail[row.tail]
            engine = engines[row.engine_serial]
            aircraft.engines[row.position - 1] = engine
            world.matching.flew_on(engine, aircraft.flying)
        if row.lease_in_until_day is not None:
            world.renting.recorded(engines[row.engine_serial])


def _settle(world: World, modules: dict[str, ModuleState]) -> None:
    """Solve every module's wear at where it flies; what does not fly is taken as flown by the type's first tail."""
    place = {m.serial: e for e in world.all_engines for m in e.modules}
    flying = {e.serial: a.flying for a in world.aircraft for e in a.engines if e is not None}
    first: dict[str, Flying] = {}
    for aircraft in world.aircraft:
        first.setdefault(aircraft.row.engine_type, aircraft.flying)
    for row in world.setup.fleet.modules:
        state = modules[row.module_serial]
        engine = place.get(row.module_serial)
        how = flying.get(engine.serial) if engine else None
        how = how or first.get(row.engine_type)
        if how is None:
            continue
        rating = (
            how.rating
            if engine is not None and engine.serial in flying
            else world.matching.default_rating(row.engine_type)
        )
        start.settle_wear(state, row, rating=rating, factor=how.wear_factor, hours=how.hours_per_cycle)


def _watch(world: World, modules: dict[str, ModuleState]) -> None:
    """Findings that limit how long a module may fly; one on an engine holds for the module that it names."""
    engines = {e.serial: e for e in world.all_engines}
    for row in world.setup.fleet.watch:
        found = [modules[row.serial]] if row.serial in modules else []
        if row.serial in engines:
            named = [m for m in engines[row.serial].modules if m.spec.module == row.module]
            found = named or engines[row.serial].modules[:1]
        for state in found:
            if row.remove_by_cycles is not None:
                state.watch_cycles = row.remove_by_cycles
            if row.remove_by_day is not None:
                state.watch_day = row.remove_by_day


def _stock(world: World) -> list[tuple[str, str, int]]:
    """Return owned spare engines and modules by type, so that stock bought for a what-if carries its capital."""
    counts: dict[tuple[str, str], int] = {}
    lessors = world.setup.lessors
    flying = {e.serial for a in world.aircraft for e in a.engines if e is not None}
    for row in world.setup.fleet.engines:
        if row.engine_serial not in flying and row.place != "leased_in" and row.owner not in lessors:
            counts[row.engine_type, "engine"] = counts.get((row.engine_type, "engine"), 0) + 1
    for module in world.setup.fleet.modules:
        if not module.engine_serial and module.owner not in lessors:
            counts[module.engine_type, module.module] = counts.get((module.engine_type, module.module), 0) + 1
    return [(kind, what, count) for (kind, what), count in sorted(counts.items())]


def _place_engines(world: World, rows: tuple[Engine, ...], engines: dict[str, EngineState]) -> None:
    """Put spares into the pool, and engines in shops where their visit has come to."""
    for row in rows:
        engine = engines[row.engine_serial]
        if row.place == "shop":
            _in_shop(world, row, engine)
        elif row.place in ("spare", "leased_in") and not row.tail:
            world.engine_pools[row.engine_type].engines.append(engine)


def _in_shop(world: World, row: Engine, engine: EngineState) -> None:
    """A visit that has begun is paid and ends on its day; one still queued is decided and booked like any other."""
    served = next((a for a in world.aircraft if a.row.engine_type == row.engine_type), None)
    if row.inducted_day is None and served is not None:
        ahead = world.matching.planned_cause(served, engine)
        removal = Removal(0, ahead.cause, ahead.slot)
        world.at(max(0.0, row.removed_day or 0.0), lambda _: world.send_away(served, engine, removal))
        return
    scope = begun_scope(world, row, engine)
    world.bench.work_on(engine, scope, day=0.0)
    ready = row.ready_day if row.ready_day is not None else _expected_ready(world, row)
    world.at(max(0.0, ready), lambda _: world.offer(engine))


def _expected_ready(world: World, row: Engine) -> float:
    for shop in world.setup.shops[row.engine_type]:
        if shop.shop == row.shop and row.visit in shop.turn:
            return (row.inducted_day or 0.0) + shop.turn[row.visit].mean_days + shop.transport_days
    return 0.0


def begun_scope(world: World, row: Engine, engine: EngineState) -> Scope:
    """Return what a visit under way does, by its kind: an overhaul restores all modules, a core visit the core, any
    visit checks the rest; parts short of the build goal in opened modules are new."""
    goal = world.setup.strategy[row.engine_type].build_goal_cycles
    rating = world.matching.rating_of(engine)
    levels = []
    for module in engine.modules:
        core = module.spec.slot in engine.spec.core
        restored = row.visit == "overhaul" or (row.visit in ("core", "") and core)
        levels.append(RESTORATION if restored else CHECK)
    replace = tuple(
        tuple(
            i
            for i, part in enumerate(module.parts)
            if part.left(module.run, rating, part.epochs[-1]) < min(goal, part.epochs[-1].limits[rating])
        )
        for module in engine.modules
    )
    return Scope(row.visit or "core", tuple(levels), replace)


def _place_modules(world: World, rows: tuple[Module, ...], modules: dict[str, ModuleState]) -> None:
    for row in rows:
        if row.engine_serial:
            continue
        state = modules[row.module_serial]
        pool = world.module_pools[row.engine_type]
        if row.place == "shop":
            level = _LEVELS[row.level_in_work] or RESTORATION
            rating = world.matching.default_rating(row.engine_type)
            _, replace = world.bench.module_scope(
                state,
                Removal(0, "limit", state.spec.slot),
                rating,
                world.setup.strategy[row.engine_type].build_goal_cycles,
            )
            world.bench.work_on_module(state, level, replace, day=0.0, rating=rating)
            ready = max(0.0, row.ready_day if row.ready_day is not None else state.spec.repair.mean_days)
            pool.coming[state.serial] = (state.spec.slot, ready)
            world.at(ready, lambda _, state=state: world.shelve(state))  # type: ignore[misc]
        else:
            pool.modules.append(state)
            world.matching.shelf_since[state.serial] = 0.0
