"""How far a part may fly from a cycle on, at the ratings and on the dates that its tail is planned for."""

from __future__ import annotations

from collections.abc import Callable

from planner.picture import cloned_module
from planner.planned_use import PlannedUse
from sim.removal import FAR, part_removal
from sim.state import ModuleState, PartState


def reach_cycles(
    part: PartState, module: ModuleState, use: PlannedUse, *, ratings: tuple[str, ...], start: float = 0.0
) -> int:
    """Return the whole cycles that a part may fly from ``start`` cycles from now on, 0 when its life is unknown.

    The part is taken in its state of that moment (``module`` gives the counts it is read against); changes of rating,
    dated limits, limits in hours and in days all count.
    """
    twin = cloned_module(module)
    twin.parts = [part]
    twin.parts_changed()
    done = 0
    first = use.at_cycles(start)
    stretches = use.stretches[use.stretches.index(first) :]
    for stretch, after in zip(stretches, (*stretches[1:], None), strict=True):
        rating, now = ratings.index(stretch.rating), max(start + done, stretch.cycles)
        removal = part_removal(twin, rating, use.day(now), _until(use, now), stretch.hours_per_cycle)
        left = FAR if after is None else int(after.cycles - start + 1e-6) - done
        if removal.cycles <= left:
            return done + removal.cycles
        twin.run[rating] += left
        twin.hsn += left * stretch.hours_per_cycle
        twin.left_rating = -1
        done += left
    return done


def _until(use: PlannedUse, now: float) -> Callable[[float], int]:
    return lambda day: max(0, int(use.cycles(day) - now + 1e-6))
