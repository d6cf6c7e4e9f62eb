"""What a strategy may see at a removal, and what it may answer.

No field holds a drawn value: no failure date, wear factor, turn time, finding or lease-in outcome. The field lists are
a test, and so is that changing every hidden value leaves a decision as it was.
"""

from __future__ import annotations

from typing import NamedTuple

from sim.spec import TypeSpec


class PartView(NamedTuple):
    """A part as planned: number, cycles left at the rating to be flown, and its limit there."""

    part_number: str
    left_cycles: int
    limit_cycles: int
    price_usd: float


class ModuleView(NamedTuple):
    """A module as the records show it. ``lost_degC`` is measured, at the rating to be flown."""

    serial: str
    slot: int
    standard: str
    parts: tuple[PartView, ...]
    lost_degC: float
    permanent_degC: float
    cycles_since_restoration: int
    hours_since_restoration: float
    first_run: bool

    @property
    def least_left(self) -> int:
        return min((part.left_cycles for part in self.parts), default=10**9)


class ShopView(NamedTuple):
    """A shop as it answers a call: expected start of an engine and of a module sent now, mean turn time by visit."""

    shop: str
    transport_days: float
    engine_start_day: float
    module_start_day: float
    turn_days: dict[str, float]


class View(NamedTuple):
    """One removal as a strategy sees it.

    ``flown``: (rating number, wear factor, environment, hours a cycle, cycles a year, wash) of the aircraft to be
    served. ``pool``: modules on the shelf, by the day they came. ``coming``: (slot, expected day) of modules in work.
    """

    day: float
    spec: TypeSpec
    engine_serial: str
    cause: str
    slot: int
    least_level: int
    modules: tuple[ModuleView, ...]
    margin_degC: float
    rating: int
    wear_factor: float
    hours_per_cycle: float
    cycles_per_year: float
    pool: tuple[ModuleView, ...]
    coming: tuple[tuple[int, float], ...]
    shops: tuple[ShopView, ...]
    team_start_day: float
    spares: int
    waiting: int
    return_day: float


class Scope(NamedTuple):
    """Work on an engine: a level for each slot, numbers of the parts to replace in each slot, the kind of visit."""

    visit: str
    levels: tuple[int, ...]
    replace: tuple[tuple[int, ...], ...]


class Decision(NamedTuple):
    """The answer: ``way`` is whole_engine, exchange or wait. ``swaps``: (slot, serial of the pool module). ``shop``:
    number of the shop. ``costs``: the expected cost of the ways weighed, for the story."""

    way: str
    shop: int
    scope: Scope
    swaps: tuple[tuple[int, str], ...]
    costs: tuple[tuple[str, float], ...]
