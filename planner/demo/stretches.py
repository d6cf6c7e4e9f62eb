"""Stretches of modules between restorations, as an estimate of hazards wants them: failed, pulled, or still on.

Ages are counted from the last restoration. A module that failed and was only checked flies on at the age it had: its
next stretch begins there, so that no hour of exposure is counted twice.
"""

from __future__ import annotations

from planner.demo.past import Past
from planner.demo.type_tables import Row
from sim.fleet import Module

_CHANCE = ("distress", "unscheduled", "early")
_PLANNED = {"margin": "margin", "limit": "limit", "directive": "limit", "unknown_life": "limit"}


class Stretches:
    """Gathers stretches while the log is walked."""

    def __init__(self, past: Past) -> None:
        self._past = past
        self._modules: dict[str, Module] = {m.module_serial: m for m in past.world.setup.fleet.modules}
        self._age = dict.fromkeys(self._modules, (0, 0.0))  # since the last restoration
        self._entered = dict(self._age)  # the age at which the running stretch began
        self._mature: set[str] = set()
        self._cause: dict[str, str] = {}
        self._rows: list[Row] = []

    def flown(self, serial: str, cycles: int, hours: float) -> None:
        age = self._age[serial]
        self._age[serial] = (age[0] + cycles, age[1] + hours)

    def removed(self, serials: list[str], day: float, detail: str) -> None:
        """Take in why an engine came off: ``cause`` or ``cause module``."""
        cause, _, name = detail.partition(" ")
        for serial in serials:
            self._cause.pop(serial, None)
            if name and self._modules[serial].module != name:
                continue
            if cause in _CHANCE and name:
                self._end(serial, day, cause, "failed")
            elif cause in _PLANNED:
                self._cause[serial] = _PLANNED[cause]

    def restored(self, serial: str, day: float) -> None:
        """Close the running stretch: the module was pulled, or its failure has just been noted."""
        self._end(serial, day, self._cause.pop(serial, "convenience"), "pulled")
        self._age[serial] = self._entered[serial] = (0, 0.0)
        self._mature.add(serial)

    def rows(self) -> list[Row]:
        """Return all stretches, those still running last."""
        for serial in self._modules:
            self._end(serial, None, "none", "still_on")
        return self._rows

    def _end(self, serial: str, day: float | None, cause: str, ended: str) -> None:
        module, since, now = self._modules[serial], self._entered[serial], self._age[serial]
        if now[0] <= since[0]:
            return
        self._rows.append(
            {
                "serial": serial,
                "engine_type": module.engine_type,
                "module": module.module,
                "cause": cause,
                "run": "mature" if serial in self._mature else "first",
                "cycles_at_install": since[0],
                "cycles_at_removal": now[0],
                "hours_at_install": round(since[1], 2),
                "hours_at_removal": round(now[1], 2),
                "removed_date": "" if day is None else self._past.date(day).isoformat(),
                "ended": ended,
            }
        )
        self._entered[serial] = now
