"""Histories read off the log: each part's stretches, links of serials, and stretches between restorations."""

from __future__ import annotations

from typing import Any, NamedTuple

from planner.demo.past import Past, part_serial
from planner.demo.state_tables import date_of
from planner.demo.type_tables import Row
from sim.events import KIND, KINDS


class Histories(NamedTuple):
    """Rows of part_history, installs and removals, and (cycles, hours) flown by tail."""

    parts: list[Row]
    installs: list[Row]
    removals: list[Row]
    tails: dict[str, tuple[int, float]]


def histories(past: Past) -> Histories:
    """Walk the log once in order of time."""
    walk = _Walk(past)
    for row in sorted(past.world.log.rows, key=lambda r: (r[2] if r[0] == KIND["flown"] else r[1], _order(r[0]))):
        walk.step(row)
    return walk.rows()


def _order(kind: int) -> int:
    """On one day: what was flown comes first, then removals, then work, then installations."""
    order = {"flown": 0, "removal": 1, "part_off": 2, "part_on": 3, "work": 4, "install": 5}
    return order.get(KINDS[kind], 6)


class _Walk:
    def __init__(self, past: Past) -> None:
        self._past = past
        fleet = past.world.setup.fleet
        self._modules = {
            e.engine_serial: [m for m in fleet.modules if m.engine_serial == e.engine_serial] for e in fleet.engines
        }
        self._parts: dict[str, list[str]] = {}
        for part in fleet.parts:
            self._parts.setdefault(part.module_serial, []).append(part.part_serial)
        self._part_rows: dict[str, list[list[Any]]] = {}
        self._tails: dict[str, tuple[int, float]] = {}
        self._cycles: dict[str, int] = {}
        self._hours: dict[str, float] = {}
        entry = {a.tail: a.entry_day or 0.0 for a in fleet.aircraft}
        self._installs: list[Row] = [
            self._link(e.engine_serial, e.tail, entry[e.tail], position=e.position)
            for e in fleet.engines
            if e.tail and entry[e.tail] <= past.world.env.now
        ]
        self._open = {row["serial"]: row for row in self._installs}
        self._removals: list[Row] = []
        self._since = {m.module_serial: (0, 0.0) for m in fleet.modules}
        self._module_row = {m.module_serial: m for m in fleet.modules}
        self._mature: set[str] = set()
        self._module_cycles = {m.module_serial: (0, 0.0) for m in fleet.modules}

    def _link(self, serial: str, parent: str, day: float, *, position: int | None = None) -> Row:
        return {
            "serial": serial,
            "parent_serial": parent,
            "position": position or "",
            "on_date": date_of(self._past, day).isoformat(),
            "off_date": "",
            "cycles_on": self._cycles.get(serial, 0),
            "hours_on": round(self._hours.get(serial, 0.0), 2),
        }

    def step(self, row: tuple[Any, ...]) -> None:
        kind, day, until, _, _, _, subject, other, detail, cycles, hours = row
        day = min(day, self._past.world.env.now)  # work that was finished early to fill a gap
        name = KINDS[kind]
        if name == "flown" and subject in self._modules:
            self._flown(day, until, subject, other, detail, cycles, hours)
        elif name == "install" and subject in self._modules:
            link = self._link(subject, other, day, position=int(detail))
            self._installs.append(link)
            self._open[subject] = link
        elif name == "removal" and subject in self._modules:
            if subject in self._open:
                self._open.pop(subject)["off_date"] = date_of(self._past, day).isoformat()
            self._failed(subject, day, detail)
        elif name == "part_off":
            self._parts[other].remove(subject)
            self._part_rows.pop(subject, None)
        elif name == "part_on":
            self._parts[other].append(subject)
        elif name == "work" and detail in ("restoration", "overhaul"):
            self._restored(subject, day)

    def _flown(self, day: float, until: float, engine: str, tail: str, rating: str, cycles: int, hours: float) -> None:
        done = self._tails.get((tail), (0, 0.0))
        # a tail flies once while each of its engines books the same cycles: engines are counted at position 1 only
        if self._open.get(engine, {}).get("position") == 1:
            self._tails[tail] = (done[0] + cycles, done[1] + hours)
        self._cycles[engine] = self._cycles.get(engine, 0) + cycles
        self._hours[engine] = self._hours.get(engine, 0.0) + hours
        for module in self._modules[engine]:
            serial = module.module_serial
            flown = self._module_cycles[serial]
            self._module_cycles[serial] = (flown[0] + cycles, flown[1] + hours)
            for part in self._parts.get(serial, []):
                stretches = self._part_rows.setdefault(part, [])
                key = [serial, engine, tail, rating]
                if stretches and stretches[-1][:4] == key:
                    stretches[-1][5] = until
                    stretches[-1][6] += cycles
                    stretches[-1][7] += hours
                else:
                    stretches.append([*key, day, until, cycles, hours])

    def _failed(self, engine: str, day: float, detail: str) -> None:
        cause, _, name = detail.partition(" ")
        if cause not in ("distress", "unscheduled") or not name:
            return
        for module in self._modules[engine]:
            if module.module == name:
                self._stretch(module.module_serial, day, cause, "failed")

    def _restored(self, serial: str, day: float) -> None:
        if self._module_cycles[serial][0] > self._since[serial][0]:
            self._stretch(serial, day, "none", "pulled")
        self._since[serial] = self._module_cycles[serial]
        self._mature.add(serial)

    def _stretch(self, serial: str, day: float | None, cause: str, ended: str) -> None:
        module = self._module_row[serial]
        since, now = self._since[serial], self._module_cycles[serial]
        last = self._removals[-1] if self._removals else {}
        if ended == "pulled" and last.get("serial") == serial and last.get("_end") == now[0]:
            return  # it failed at this very age; the restoration is the cure, not another end
        self._removals.append(
            {
                "serial": serial,
                "engine_type": module.engine_type,
                "module": module.module,
                "cause": cause,
                "run": "mature" if serial in self._mature else "first",
                "cycles_at_install": 0,
                "cycles_at_removal": now[0] - since[0],
                "hours_at_install": 0,
                "hours_at_removal": round(now[1] - since[1], 2),
                "removed_date": "" if day is None else date_of(self._past, day).isoformat(),
                "ended": ended,
                "_end": now[0],
            }
        )

    def rows(self) -> Histories:
        for serial in self._module_row:
            if self._module_cycles[serial][0] > self._since[serial][0]:
                self._stretch(serial, None, "none", "still_on")
        parts = []
        for module in self._past.world.all_modules:
            for part in module.parts:
                for stretch in self._part_rows.get(part.serial, []):
                    parts.append(self._part_row(part.serial, stretch))
        for row in self._removals:
            row.pop("_end")
        return Histories(parts, self._installs, self._removals, self._tails)

    def _part_row(self, serial: str, stretch: list[Any]) -> Row:
        module, engine, tail, rating, since, until, cycles, hours = stretch
        return {
            "part_serial": part_serial(serial),
            "module_serial": module,
            "engine_serial": engine,
            "tail": tail,
            "rating": rating,
            "from_date": date_of(self._past, since).isoformat(),
            "to_date": date_of(self._past, until).isoformat(),
            "cycles": cycles,
            "hours": round(hours, 2),
            "source": "tracking record",
        }
