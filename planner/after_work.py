"""An engine as it will be after work or an exchange: copies only, expected values only.

The rules are those of sim/visit.py with every draw at its mean: a restored module takes the type's wear factor, a new
part has its whole life.
"""

from __future__ import annotations

import math
from collections.abc import Mapping

from planner.picture import Picture, cloned, cloned_module
from sim.spec import RESTORATION
from sim.state import EngineState, ModuleState, PartState
from sim.view import Scope


def after_visit(view: Picture, engine: EngineState, scope: Scope, *, rating: int, day: float) -> EngineState:
    """Return the engine after a shop visit that ends on ``day``, built for a rating."""
    twin = cloned(engine)
    twin.modules = [
        after_repair(
            view, module, level=scope.levels[module.spec.slot], replace=scope.replace[module.spec.slot],
            rating=rating, day=day,
        )
        for module in engine.modules
    ]  # fmt: skip
    twin.csb = 0
    return twin


def after_repair(
    view: Picture, module: ModuleState, *, level: int, replace: tuple[int, ...], rating: int, day: float
) -> ModuleState:
    """Return a module after one level of work and the replacement of the numbered parts."""
    twin = cloned_module(module)
    for number in replace:
        twin.parts[number] = _new_part(view, twin, number, day=day)
    if replace:
        twin.parts_changed()
    if level >= RESTORATION:
        _restore(twin, level, rating)
    if level or replace:
        twin.watch_cycles, twin.watch_day = -1, math.inf
        twin.csb, twin.hsb = 0, 0.0
    return twin


def after_exchange(engine: EngineState, modules: Mapping[int, ModuleState]) -> EngineState:
    """Return the engine with other modules in the numbered slots."""
    twin = cloned(engine)
    for slot, module in modules.items():
        twin.modules[slot] = cloned_module(module)
        twin.modules[slot].csb, twin.modules[slot].hsb = 0, 0.0
    return twin


def _restore(module: ModuleState, level: int, rating: int) -> None:
    total = module.loss + module.permanent
    if module.first_run:
        module.permanent = min(total, module.spec.wear[rating].unrecoverable)
        module.first_run = False
    module.loss = (total - module.permanent) * (1.0 - module.spec.restores[level])
    module.csr, module.hsr, module.factor = 0, 0.0, 1.0


def _new_part(view: Picture, module: ModuleState, number: int, *, day: float) -> PartState:
    old = module.parts[number]
    new = PartState(
        f"new {old.spec.part_number}",
        old.spec,
        epochs=view.world.known.new_epochs[old.spec.part_number],
        flown=(0,) * len(old.flown),
        made_day=day,
        owner=old.owner,
    )
    new.mark, new.mark_hours = tuple(module.run), module.hsn
    return new
