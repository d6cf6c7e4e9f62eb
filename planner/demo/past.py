"""A plausible past: the fleet delivered new, flown to the as-of date by the same simulation that looks ahead.

So no part is past its limit, margins and hazards follow the same laws, and every link adds up. What is read off is the
state on the as-of date, the log of how it came about, and a reading of every margin each month of the last years.
"""

from __future__ import annotations

import datetime as dt
import tempfile
from pathlib import Path
from typing import NamedTuple

from planner.assemble import load
from planner.demo.deliver import deliver
from planner.demo.luck import uniform
from planner.demo.readings import Readings
from planner.demo.settle import settle
from planner.demo.sub_fleets import AS_OF, Tail
from planner.demo.type_tables import Row
from planner.demo.write import write_tables
from sim.draws import normal
from sim.setting_out import set_out
from sim.spec import setup
from sim.start import names
from sim.world import World

RATING_CHANGE = dt.date(2022, 4, 1)
_OLDER_RATING = "high"  # what the tails that changed flew at before


class Past(NamedTuple):
    """The world on the as-of date, its first day, what was delivered, the tails whose rating changed, the readings of
    margins, and the engines that are in a shop."""

    world: World
    start: dt.date
    delivered: dict[str, list[Row]]
    changed_rating: tuple[str, ...]
    readings: list[Row]
    in_shops: tuple[str, ...]

    def date(self, day: float) -> dt.date:
        """Return the calendar date of a day of the past."""
        return self.start + dt.timedelta(days=int(day))


def live(tails: list[Tail], tables: dict[str, list[Row]], *, scale: float, seed: int) -> Past:
    """Fly a new fleet up to the as-of date, put it in order, and return where it stands."""
    start = min(tail.entry for tail in tails) - dt.timedelta(days=1)
    delivered = deliver(tails, scale=scale)
    changed = _changed_ratings(tails)
    for row in delivered["aircraft"]:
        if row["tail"] in changed:
            after = row["rating"]
            row |= {"rating": _OLDER_RATING, "rating_until": RATING_CHANGE.isoformat(), "rating_after": after}
    settings = [row for row in tables["settings"] if row["name"] not in ("as_of", "price_date", "horizon_years")]
    settings += [{"name": "as_of", "value": start.isoformat()}, {"name": "horizon_years", "value": 20}]
    with tempfile.TemporaryDirectory() as folder:
        write_tables(Path(folder), {**tables, **delivered, "settings": settings})
        fleet = load(Path(folder))
    days = float((AS_OF - start).days)
    ready = setup(fleet, "whole_engine", horizon_days=days)
    world = World(ready, names(ready), seed=seed, run=0)
    set_out(world)
    _first_luck(world, seed)
    for aircraft in world.aircraft:
        world.env.process(aircraft.life())
    readings = Readings(world, start, seed=seed)
    readings.each_month()
    world.env.run(until=days)
    for aircraft in world.aircraft:
        aircraft.book_now()
    in_shops = settle(world, scale=scale)
    readings.take()
    return Past(world, start, delivered, changed, readings.rows, in_shops)


def _changed_ratings(tails: list[Tail]) -> tuple[str, ...]:
    """Return the tails of NA at mid that were old enough to fly at high before: every second of them."""
    found = [t for t in tails if t.sub_fleet.code == "NA" and t.rating == "mid" and t.entry < RATING_CHANGE]
    return tuple(t.tail for t in found if t.number % 4 in (0, 2))


def _first_luck(world: World, seed: int) -> None:
    """Give each new module its own wear and each new engine its own margin; the tables of a new fleet cannot."""
    for module in world.all_modules:
        z = max(-3.0, min(3.0, normal(uniform(seed, "wear", module.serial))))
        module.factor = max(0.05, 1.0 + module.spec.spread * z)
    for engine in world.all_engines:
        spread = max(engine.spec.margin_spread)
        engine.offset_degC = spread * normal(uniform(seed, "margin", engine.serial))
