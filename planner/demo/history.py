"""Histories read off the log: each part's stretches, links of serials, and stretches between restorations."""

from __future__ import annotations

from typing import Any, NamedTuple

from planner.demo.deliver import part_serial
from planner.demo.past import Past
from planner.demo.stretches import Stretches
from planner.demo.type_tables import Row
from sim.events import KIND, KINDS

_ORDER = {"flown": 0, "removal": 1, "part_off": 2, "part_on": 3, "work": 4, "install": 5}


class Histories(NamedTuple):
    """Rows of part_history, installs and removals, and (cycles, hours) flown by tail."""

    parts: list[Row]
    installs: list[Row]
    removals: list[Row]
    tails: dict[str, tuple[int, float]]


def histories(past: Past) -> Histories:
    """Walk the log once in order of time; on one day what was flown comes first, then removals, work, installations."""
    walk = _Walk(past)
    flown = KIND["flown"]
    rows = sorted(past.world.log.rows, key=lambda r: (r[2] if r[0] == flown else r[1], _ORDER.get(KINDS[r[0]], 6)))
    for row in rows:
        walk.step(row)
    return walk.rows()


class _Walk:
    """What has been gathered so far."""

    def __init__(self, past: Past) -> None:
        self._past = past
        fleet = past.world.setup.fleet
        self._modules: dict[str, list[str]] = {e.engine_serial: [] for e in fleet.engines}
        for module in fleet.modules:
            self._modules[module.engine_serial].append(module.module_serial)
        self._parts: dict[str, list[str]] = {}
        for part in fleet.parts:
            self._parts.setdefault(part.module_serial, []).append(part.part_serial)
        self._part_rows: dict[str, list[list[Any]]] = {}
        self._flown: dict[str, tuple[int, float]] = {}
        self._stretches = Stretches(past)
        entry = {a.tail: a.entry_day or 0.0 for a in fleet.aircraft}
        self._installs: list[Row] = []
        self._open: dict[str, Row] = {}
        for engine in fleet.engines:
            day = entry.get(engine.tail, 0.0)
            if day <= past.world.env.now:
                if engine.tail:
                    self._link(engine.engine_serial, engine.tail, day, position=engine.position)
                for serial in self._modules[engine.engine_serial]:
                    self._link(serial, engine.engine_serial, day)

    def _link(self, serial: str, parent: str, day: float, *, position: int | None = None) -> None:
        cycles, hours = self._flown.get(serial, (0, 0.0))
        row: Row = {
            "serial": serial,
            "parent_serial": parent,
            "position": position or "",
            "on_date": self._past.date(day).isoformat(),
            "off_date": "",
            "cycles_on": cycles,
            "hours_on": round(hours, 2),
        }
        self._installs.append(row)
        self._open[serial] = row

    def step(self, row: tuple[Any, ...]) -> None:
        """Take in one row of the log; what concerns engines rented in the past is left out."""
        kind, day, until, _, _, _, subject, other, detail, cycles, hours = row
        day = min(day, self._past.world.env.now)  # work that was finished early to put the fleet in order
        name = KINDS[kind]
        if name == "flown" and subject in self._modules:
            self._fly(day, until, subject, other, detail, cycles, hours)
        elif name == "install" and subject in self._modules:
            self._link(subject, other, day, position=int(detail))
        elif name == "removal" and subject in self._modules:
            if subject in self._open:
                self._open.pop(subject)["off_date"] = self._past.date(day).isoformat()
            self._stretches.removed(self._modules[subject], day, detail)
        elif name == "part_off":
            self._parts[other].remove(subject)
            self._part_rows.pop(subject, None)
        elif name == "part_on":
            self._parts[other].append(subject)
        elif name == "work" and detail in ("restoration", "overhaul"):
            self._stretches.restored(subject, day)

    def _fly(self, day: float, until: float, engine: str, tail: str, rating: str, cycles: int, hours: float) -> None:
        # a tail flies once while each of its engines books the same cycles: those at position 1 count for it
        serials = [engine, *self._modules[engine]]
        if self._open.get(engine, {}).get("position") == 1:
            serials.append(tail)
        for serial in serials:
            done = self._flown.get(serial, (0, 0.0))
            self._flown[serial] = (done[0] + cycles, done[1] + hours)
        for module in self._modules[engine]:
            self._stretches.flown(module, cycles, hours)
            for part in self._parts.get(module, []):
                self._fly_part(part, [module, engine, tail, rating], day, until, cycles, hours)

    def _fly_part(self, part: str, where: list[str], day: float, until: float, cycles: int, hours: float) -> None:
        rows = self._part_rows.setdefault(part, [])
        if rows and rows[-1][:4] == where:
            rows[-1][5] = until
            rows[-1][6] += cycles
            rows[-1][7] += hours
        else:
            rows.append([*where, day, until, cycles, hours])

    def rows(self) -> Histories:
        """Return what was gathered; only parts that are still somewhere have a history worth keeping."""
        parts = [
            self._part_row(part.serial, stretch)
            for engine in self._past.world.all_engines
            for module in engine.modules
            for part in module.parts
            for stretch in self._part_rows.get(part.serial, [])
        ]
        tails = {a.row.tail: self._flown.get(a.row.tail, (0, 0.0)) for a in self._past.world.aircraft}
        return Histories(parts, self._installs, self._stretches.rows(), tails)

    def _part_row(self, serial: str, stretch: list[Any]) -> Row:
        module, engine, tail, rating, since, until, cycles, hours = stretch
        return {
            "part_serial": part_serial(serial),
            "module_serial": module,
            "engine_serial": engine,
            "tail": tail,
            "rating": rating,
            "from_date": self._past.date(since).isoformat(),
            "to_date": self._past.date(until).isoformat(),
            "cycles": cycles,
            "hours": round(hours, 2),
            "source": "tracking record",
        }
