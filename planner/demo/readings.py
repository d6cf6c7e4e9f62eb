"""Readings of the margin of every engine on a wing, month by month, with noise, outliers, washes and visits."""

from __future__ import annotations

import datetime as dt
from typing import NamedTuple

from planner.demo.luck import uniform
from planner.demo.sub_fleets import AS_OF
from planner.demo.type_tables import Row
from sim.aircraft import AircraftProcess
from sim.draws import normal
from sim.removal import margin_now
from sim.state import EngineState
from sim.world import World

_MONTHS = 30
_LEAST_CYCLES = 20  # the first flights after an installation give no reading
_OUTLIER_CHANCE, _OUTLIER_FACTOR = 0.02, 4.0


class _Seen(NamedTuple):
    """Cycles since build, and where an engine flew, at its last reading."""

    since_build: int
    visits: int


class Readings:
    """Takes readings while the past is flown."""

    def __init__(self, world: World, start: dt.date, *, seed: int) -> None:
        self._world, self._start, self._seed = world, start, seed
        self._seen: dict[str, _Seen] = {}
        self.rows: list[Row] = []

    def each_month(self) -> None:
        """Take readings on the first of each month of the last years."""
        for back in range(_MONTHS, 0, -1):
            months = AS_OF.year * 12 + AS_OF.month - 1 - back
            day = float((dt.date(months // 12, months % 12 + 1, 1) - self._start).days)
            if day > 0.0:
                self._world.at(day, lambda _: self.take())

    def take(self) -> None:
        """Read every engine that flies now; what was flown is booked, nothing else moves."""
        for aircraft in self._world.aircraft:
            aircraft.book_now()
            for engine in aircraft.engines:
                if engine is not None and engine.modules and not engine.leased:
                    self._read(aircraft, engine)

    def _read(self, aircraft: AircraftProcess, engine: EngineState) -> None:
        event = self._event(aircraft, engine)
        if engine.since_cycles < _LEAST_CYCLES and event != "visit":
            return
        if not engine.csn or (engine.serial not in self._seen and engine.since_cycles < _LEAST_CYCLES):
            return
        self._seen[engine.serial] = _Seen(engine.csb, engine.visits)
        date = self._start + dt.timedelta(days=int(self._world.env.now))
        u = uniform(self._seed, "noise", engine.serial, date)
        outlier = uniform(self._seed, "outlier", engine.serial, date) < _OUTLIER_CHANCE
        sigma = self._world.engine_rows[engine.spec.engine_type].reading_noise_degC
        noise = sigma * normal(u) * (_OUTLIER_FACTOR if outlier else 1.0)
        self.rows.append(
            {
                "engine_serial": engine.serial,
                "date": date.isoformat(),
                "cycles_since_install": engine.since_cycles,
                "margin_degC": round(margin_now(engine, aircraft.flying) + noise, 1),
                "event": event,
            }
        )

    def _event(self, aircraft: AircraftProcess, engine: EngineState) -> str:
        """Return what was done since the last reading."""
        seen = self._seen.get(engine.serial)
        if seen is None:
            return ""
        if engine.csb < seen.since_build or engine.visits != seen.visits:
            return "visit"
        wash = aircraft.flying.wash
        return "wash" if wash is not None and engine.csb // wash[2] > seen.since_build // wash[2] else ""
