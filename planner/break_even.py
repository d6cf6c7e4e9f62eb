"""How much core life must be left for an exchange to beat bringing the core visit forward.

The engine is taken as it is, but with its core younger or older by the same cycles in every core module that does not
limit: parts, hours and wear alike. The break-even is the least core life from which on the exchange costs no more.
"""

from __future__ import annotations

import copy
from typing import NamedTuple

from planner.after_work import after_exchange, after_repair
from planner.picture import cloned, foreseen
from planner.ways_out import Off, costed_ways
from sim.spec import RESTORATION
from sim.state import EngineState, ModuleState, PartState
from sim.wear import gained

_STEP_CYCLES, _MOST_CYCLES = 500, 12_000
_EXACT_CYCLES = 25


class BreakEven(NamedTuple):
    """Core life left now, and the least with which B beats A2 (None: at no life up to the most that was tried)."""

    core_left_cycles: int
    least_cycles: int | None
    tried_cycles: int


def break_even(off: Off) -> BreakEven:
    """Return the break-even of core life for the cheapest exchange with a full shelf."""
    left = core_left_cycles(off, off.engine)
    curve: dict[int, float] = {}

    def gain(older: int) -> float:
        """Return what B saves against A2 when the core is older (negative: younger) by so many cycles."""
        if older not in curve:
            ways = costed_ways(_aged(off, older), shelf="full")
            core = next(way.cost_usd for way in ways if way.way == "A2")
            curve[older] = core - min(way.cost_usd for way in ways if way.way == "B")
        return curve[older]

    last = left - 1
    points = [last - step for step in range(0, _MOST_CYCLES, _STEP_CYCLES)]
    worse = [older for older in points if gain(older) < 0.0]
    if not worse:
        return BreakEven(left, 0, _MOST_CYCLES)
    low = min(worse)  # the youngest core at which B still loses
    if low == points[-1]:
        return BreakEven(left, None, _MOST_CYCLES)
    high = low - _STEP_CYCLES
    while low - high > _EXACT_CYCLES:
        middle = (low + high) // 2
        low, high = (middle, high) if gain(middle) < 0.0 else (low, middle)
    return BreakEven(left, max(0, left - high), _MOST_CYCLES)


def core_left_cycles(off: Off, engine: EngineState) -> int:
    """Return the cycles to the next core visit if the module that limits were no issue."""
    slot = off.seen.slot if off.seen.slot >= 0 else max(off.seen.modules, key=lambda m: m.lost_degC).slot
    own = engine.modules[slot]
    fresh = after_repair(
        off.view, own, level=RESTORATION, replace=tuple(range(len(own.parts))), rating=off.seen.rating, day=off.seen.day
    )
    return foreseen(off.view, after_exchange(engine, {slot: fresh}), off.tail, day=off.seen.day).cycles


def _aged(off: Off, older: int) -> Off:
    """Return the engine with a core that is older by so many cycles, and what a planner then sees."""
    twin = cloned(off.engine)
    for slot in off.seen.spec.core:
        if slot != off.seen.slot:
            _age(twin.modules[slot], older, off)
    process = off.view.tails[off.tail]
    matching = off.view.world.matching
    seen = matching.view(process, twin, matching.planned_cause(process, off.engine)._replace(cycles=0))
    seen = seen._replace(cause=off.seen.cause, slot=off.seen.slot, least_level=off.seen.least_level)
    return off._replace(engine=twin, seen=seen)


def _age(module: ModuleState, older: int, off: Off) -> None:
    """Make one module older (or younger, not below new) in place: parts, counts since restoration, loss."""
    rating, hours = off.seen.rating, off.seen.hours_per_cycle
    law, factor = module.spec.wear[rating], off.seen.wear_factor
    since = max(0, module.csr + older)
    change = gained(law, 0.0, since, hours) - gained(law, 0.0, module.csr, hours)
    module.loss = max(0.0, module.loss + factor * change)
    module.hsr = max(0.0, module.hsr + (since - module.csr) * hours)
    module.csr = since
    for number, part in enumerate(module.parts):
        flown = list(part.counts(module.run))
        flown[rating] = max(0, flown[rating] + older)
        module.parts[number] = _with_counts(module, number, tuple(flown))
    module.parts_changed()


def _with_counts(module: ModuleState, number: int, counts: tuple[int, ...]) -> PartState:

    part = copy.copy(module.parts[number])
    part.flown, part.mark = counts, tuple(module.run)
    return part
