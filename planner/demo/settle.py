"""The fleet put in order on the as-of date: tails complete, so many engines in shops, no tail with two weak engines.

The past ends wherever luck left it. A planner would not show a fleet with tails on the ground as the start of a study,
so visits beyond those that the scenario names are finished, gaps are filled, and an engine that would make its tail
weak has its visit before the records close. Everything is done by the simulation's own hands, and logged.
"""

from __future__ import annotations

import math
from dataclasses import replace

from sim.aircraft import AircraftProcess
from sim.events import KIND
from sim.removal import margin_now, planned_removal
from sim.setting_out import begun_scope
from sim.state import EngineState
from sim.world import World

_IN_SHOPS = {"N": 2, "W": 1}
# an engine within these of the settings' bounds for "weak" has its visit first
_MARGIN_TO_SPARE_DEGC, _CYCLES_TO_SPARE = 3.0, 60


def settle(world: World, *, scale: float) -> tuple[str, ...]:
    """Put the fleet in order; return the serials of the engines that are in a shop or on their way."""
    stay: list[str] = []
    for kind in sorted(world.engine_pools):
        gaps = _gaps(world, kind)
        away = _away(world, kind)
        spare = len(world.engine_pools[kind].engines) + len(away) - len(gaps)
        kept = away[: max(0, min(round(_IN_SHOPS[kind] * scale), spare, len(away)))]
        stay += [engine.serial for engine in kept]
        for engine in away:
            if engine not in kept:
                _finish(world, engine)
                world.engine_pools[kind].engines.append(engine)
        for aircraft, position in gaps:
            _fill(world, aircraft, position)
    for aircraft in world.aircraft:
        if aircraft.row.entry_day is None or aircraft.row.entry_day <= world.env.now:
            _strengthen(world, aircraft)
    return tuple(stay)


def _gaps(world: World, kind: str) -> list[tuple[AircraftProcess, int]]:
    return [
        (aircraft, position)
        for aircraft in world.aircraft
        for position, engine in enumerate(aircraft.engines)
        if aircraft.row.engine_type == kind and (engine is None or engine.leased)
    ]


def _away(world: World, kind: str) -> list[EngineState]:
    """Return the engines neither on a wing nor on a shelf: visits begun last come first, then what still queues."""
    hung = {engine.serial for aircraft in world.aircraft for engine in aircraft.engines if engine is not None}
    shelf = {engine.serial for engine in world.engine_pools[kind].engines}
    own = [e for e in world.all_engines if e.spec.engine_type == kind and not e.leased and e.modules]
    found = [e for e in own if e.serial not in hung and e.serial not in shelf]
    begun = {e.serial: world.under_way[e.serial][0] for e in found if e.serial in world.under_way}
    return sorted(found, key=lambda e: (e.serial not in begun, -begun.get(e.serial, 0.0), e.serial))


def _finish(world: World, engine: EngineState) -> None:
    """Do the work of a visit at once: the one that is under way, or a core visit."""
    begun = world.under_way.pop(engine.serial, None)
    if begun is not None:
        begun[1]()
        return
    row = next(e for e in world.setup.fleet.engines if e.engine_serial == engine.serial)
    world.bench.work_on(engine, begun_scope(world, replace(row, visit="core"), engine), day=world.env.now)
    engine.visits += 1


def _fill(world: World, aircraft: AircraftProcess, position: int) -> None:
    """Hang the spare that fits best; where none fits, the best one after a visit."""
    pool = world.engine_pools[aircraft.row.engine_type].engines
    aircraft.engines[position] = None
    fitting = [(world.matching.fit_value(aircraft, position, engine), engine.serial) for engine in pool]
    value, serial = min(fitting)
    engine = next(one for one in pool if one.serial == serial)
    pool.remove(engine)
    if value == math.inf:
        _finish(world, engine)
    _hang(world, aircraft, position, engine)


def _hang(world: World, aircraft: AircraftProcess, position: int, engine: EngineState) -> None:
    aircraft.engines[position] = engine
    engine.since_cycles, engine.since_hours = 0, 0.0
    world.matching.flew_on(engine, aircraft.flying)
    world.log.fact(KIND["install"], world.env.now, engine.serial, aircraft.row.tail, str(position + 1))


def _strengthen(world: World, aircraft: AircraftProcess) -> None:
    """Give the weakest engine its visit while two are weak, or one is weak in life and margin both."""
    for _ in range(2 * len(aircraft.engines)):
        signs = [(_signs(world, aircraft, engine), engine.serial, engine) for engine in aircraft.engines if engine]
        weak = sorted((one for one in signs if one[0]), key=lambda one: (-one[0], one[1]))
        if len(weak) < 2 and not any(count > 1 for count, _, _ in weak):
            return
        engine = weak[0][2]
        world.log.fact(KIND["removal"], world.env.now, engine.serial, aircraft.row.tail, "planned")
        _finish(world, engine)
        _hang(world, aircraft, aircraft.engines.index(engine), engine)


def _signs(world: World, aircraft: AircraftProcess, engine: EngineState) -> int:
    """Return how many signs of weakness an engine shows: little margin, little life (3 where it must come off now)."""
    settings = world.setup.fleet.settings
    ahead = planned_removal(engine, aircraft.flying, world.env.now, aircraft.until).cycles
    least = min(module.plain_left(aircraft.flying.rating) for module in engine.modules)
    if ahead < _CYCLES_TO_SPARE:
        return 3
    margin = min(margin_now(engine, aircraft.flying), engine.margin_degC(aircraft.flying.rating))
    little_margin = margin < settings.weak_margin_degC + _MARGIN_TO_SPARE_DEGC
    return int(little_margin) + int(least < settings.weak_cycles + _CYCLES_TO_SPARE)
