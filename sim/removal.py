"""The next removal of one engine in closed form: competing causes, the first one bites.

Planned and chance causes alike are counted in cycles of the aircraft that flies the engine. An installation ends on
completion of cycle n, the least over the causes; a hard limit is never passed, not by one cycle.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import NamedTuple

from sim import hazard
from sim.state import EngineState, Flying, ModuleState
from sim.wear import Slope, cycles_to, wash_gain

CAUSES = (
    "limit",
    "directive",
    "unknown_life",
    "finding",
    "margin",
    "distress",
    "unscheduled",
    "early",
    "lease_end",
    "return",
    "exit",
    "planned",
    "robbed",
)
FAR = 10**9


class Removal(NamedTuple):
    """When (in cycles from now), why, and which slot (-1: the whole engine) ends an installation."""

    cycles: int
    cause: str
    slot: int


def part_removal(
    module: ModuleState, rating: int, day: float, until: Callable[[float], int], hours_per_cycle: float
) -> Removal:
    """Return when a module's parts must come off. ``until(day)``: whole cycles flown by that day."""
    slot = module.spec.slot
    if not module.slow:
        left = module.plain_left(rating)
        unknown = left <= 0 and any(not part.known for part in module.parts)
        return Removal(max(0, left), "unknown_life" if unknown else "limit", slot)
    best = Removal(FAR, "limit", slot)
    for part in module.parts:
        at = part.epoch_at(day)
        left, cause = part.left(module.run, rating, at), "directive" if at.directive else "limit"
        if not part.known:
            cause = "unknown_life"
        for later in part.epochs:
            if later.day > day:
                # under the later limit from its day on: it may fly at most up to that day, or what the limit leaves
                then = max(until(later.day), part.left(module.run, rating, later))
                if then < left:
                    left, cause = then, "directive" if later.directive else "limit"
        if at.limit_hours < math.inf:
            hours = part.hours + module.hsn - part.mark_hours
            left = min(left, int((at.limit_hours - hours) / hours_per_cycle + 1e-9))
        if at.limit_days < math.inf:
            left = min(left, until(part.made_day + at.limit_days))
        if left < best.cycles:
            best = Removal(max(0, left), cause, slot)
    return best


def slope(engine: EngineState, flying: Flying, *, own_factor: bool = True) -> Slope:
    """Return how the engine's margin falls ahead; with ``own_factor`` false as expected, without the hidden factors."""
    early: dict[float, float] = {}
    steady = 0.0
    rating, hours = flying.rating, flying.hours_per_cycle
    for module in engine.modules:
        law = module.spec.wear[rating]
        factor = flying.wear_factor * law.unit_degC * (module.factor if own_factor else 1.0)
        steady += factor * (law.per_cycle + law.per_hour * hours)
        if law.early:
            tau = law.scale_cycles
            early[tau] = early.get(tau, 0.0) + factor * law.early * math.exp(-module.csr / tau)
    return Slope(tuple((amount, tau) for tau, amount in early.items()), steady)


def margin_cycles(engine: EngineState, flying: Flying, *, own_factor: bool = True) -> float:
    """Return the cycles until the margin meets the removal threshold (inf: never)."""
    above = engine.margin_degC(flying.rating) - engine.spec.removal_margin
    falling = slope(engine, flying, own_factor=own_factor)
    wash = flying.wash
    if wash is None:
        return cycles_to(falling, above)
    gain, half_life, every, _ = wash
    return cycles_to(falling, above, gain_degC=gain, half_life=half_life, every=every, phase=engine.csb % every)


def margin_now(engine: EngineState, flying: Flying) -> float:
    """Return the hot-day margin with what is left of the last wash."""
    wash = flying.wash
    gain = wash_gain(gain_degC=wash[0], half_life=wash[1], every=wash[2], since=engine.csb) if wash else 0.0
    return engine.margin_degC(flying.rating) + gain


def chance_removal(module: ModuleState, flying: Flying) -> Removal:
    """Return the first of a module's chance causes."""
    best, cause = math.inf, ""
    hours = flying.hours_per_cycle
    for i, one in enumerate(module.hazards()):
        scale = hazard.scale_in(flying.environment, one.scale, one.exponent)
        age = module.age(one)
        ahead = hazard.age_when(module.budgets[i], age, one.shape, scale) - age
        if one.hours:
            ahead /= hours
        if ahead < best:
            best, cause = ahead, one.cause
    if module.early_at > module.csb and module.early_at - module.csb < best:
        best, cause = module.early_at - module.csb, "early"
    if best >= FAR:
        return Removal(FAR, cause or "unscheduled", module.spec.slot)
    return Removal(max(1, math.ceil(best - 1e-9)), cause, module.spec.slot)


def next_removal(engine: EngineState, flying: Flying, day: float, until: Callable[[float], int]) -> Removal:
    """Return the first removal of an engine as it is flown now, hidden causes included."""
    best = Removal(FAR, "limit", -1)
    for module in engine.modules:
        part = part_removal(module, flying.rating, day, until, flying.hours_per_cycle)
        if part.cycles < best.cycles:
            best = part
        chance = chance_removal(module, flying)
        if chance.cycles < best.cycles:
            best = chance
        watch = watch_removal(module, until)
        if watch.cycles < best.cycles:
            best = watch
    if engine.modules:
        margin = margin_cycles(engine, flying)
        if margin < best.cycles:
            best = Removal(max(0, math.ceil(margin - 1e-6)), "margin", -1)
    return best


def watch_removal(module: ModuleState, until: Callable[[float], int]) -> Removal:
    """Return when a recorded finding takes the module off."""
    cycles = FAR if module.watch_cycles < 0 else module.watch_cycles
    if module.watch_day < math.inf:
        cycles = min(cycles, until(module.watch_day))
    return Removal(cycles, "finding", module.spec.slot)


def planned_removal(engine: EngineState, flying: Flying, day: float, until: Callable[[float], int]) -> Removal:
    """Return the first removal that can be foreseen: limits, findings, and margin along the expected law."""
    best = Removal(FAR, "limit", -1)
    for module in engine.modules:
        for one in (
            part_removal(module, flying.rating, day, until, flying.hours_per_cycle),
            watch_removal(module, until),
        ):
            if one.cycles < best.cycles:
                best = one
    if engine.modules:
        margin = margin_cycles(engine, flying, own_factor=False)
        if margin < best.cycles:
            best = Removal(max(0, math.ceil(margin - 1e-6)), "margin", -1)
    return best
