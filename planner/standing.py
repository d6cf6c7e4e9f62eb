"""What is where today, the weakest first: each engine with what limits it, its margin and its place; the shelves."""

from __future__ import annotations

from typing import Any

from sim.fleet import Fleet
from sim.removal import planned_removal
from sim.setting_out import set_out
from sim.spec import setup
from sim.start import names
from sim.world import World

Rows = list[dict[str, Any]]


def engines(fleet: Fleet) -> Rows:
    """Return a row an engine: place, tail, rating, margin (degC), cycles left and the part that limits, state in words;
    engines on the wing first, the weakest first. Nothing random is read."""
    world = _today(fleet)
    places = {e.engine_serial: e for e in fleet.engines}
    rows = []
    for engine in world.all_engines:
        row = places[engine.serial]
        rating = world.matching.rating_of(engine)
        aircraft = next((a for a in world.aircraft if engine in a.engines), None)
        left, limited_by = 10**9, ""
        for module in engine.modules:
            for part in module.parts:
                cycles = max(0, part.left(module.run, rating, part.epoch_at(0.0)))
                if cycles < left:
                    left, limited_by = cycles, f"{part.serial} ({module.spec.module})"
        margin = engine.margin_degC(rating)
        rows.append(
            {
                "engine_serial": engine.serial,
                "engine_type": engine.spec.engine_type,
                "place": row.place.replace("_", " "),
                "tail": row.tail,
                "position": row.position,
                "base_or_shop": row.shop or row.base or (aircraft.row.base if aircraft else ""),
                "rating": engine.spec.ratings[rating],
                "cycles_left": left,
                "limited_by": limited_by,
                "margin_degC": round(margin, 1),
                "next_removal": _next(world, aircraft, engine),
                "state": _state(fleet, left, margin),
                "owner": row.owner or "own",
            }
        )
    order = {"wing": 0, "spare": 1, "leased in": 2, "shop": 3}
    return sorted(rows, key=lambda r: (order[r["place"]], _rank(fleet, r), r["engine_serial"]))


def _today(fleet: Fleet) -> World:
    ready = setup(fleet, fleet.strategies[0].strategy, horizon_days=1.0)
    world = World(ready, names(ready), seed=0, run=0)
    set_out(world)
    return world


def _next(world: World, aircraft: Any, engine: Any) -> str:
    """Return the first foreseeable removal in words, at planned use."""
    if aircraft is None:
        return ""
    aircraft.reference = 0.0
    planned = planned_removal(engine, aircraft.flying, 0.0, aircraft.until)
    if planned.cycles >= 10**8:
        return "none foreseen"
    date = world.season.date(world.season.day(planned.cycles / aircraft.cycles_per_year))
    return f"{planned.cause.replace('_', ' ')}, {date.isoformat()}"


def _state(fleet: Fleet, left: int, margin: float) -> str:
    if left <= 0:
        return "at limit or unknown"
    settings = fleet.settings
    return "weak" if left < settings.weak_cycles or margin < settings.weak_margin_degC else "in order"


def _rank(fleet: Fleet, row: dict[str, Any]) -> float:
    """The weaker of life and margin, each against what counts as weak."""
    settings = fleet.settings
    life = float(row["cycles_left"]) / max(1, settings.weak_cycles)
    return min(life, float(row["margin_degC"]) / max(0.1, settings.weak_margin_degC))


def spare_modules(fleet: Fleet) -> Rows:
    """Return the modules in no engine: where, what standard, ready when."""
    return [
        {
            "module_serial": m.module_serial,
            "engine_type": m.engine_type,
            "module": m.module,
            "place": m.place or "pool",
            "base_or_shop": m.shop or m.base,
            "standard": m.standard,
            "cycles_since_restoration": m.cycles_since_restoration,
            "owner": m.owner or "own",
        }
        for m in fleet.modules
        if not m.engine_serial
    ]
