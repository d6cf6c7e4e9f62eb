"""Owners and places: every serial that is in another owner's assembly, and by when it must go back."""

from __future__ import annotations

import datetime as dt
from typing import NamedTuple

from sim.fleet import Fleet, Lease

OPERATOR = "the operator"
"""What a blank owner means."""


class Elsewhere(NamedTuple):
    """One serial in another owner's assembly; columns as in the output table ``life_places``."""

    serial: str
    owner: str
    place: str
    flies_on: str
    flies_on_owner: str
    due_back: dt.date | None


def elsewhere(fleet: Fleet) -> tuple[Elsewhere, ...]:
    """Return modules on engines and parts in modules of another owner, the earliest due back first."""
    engines = {engine.engine_serial: engine for engine in fleet.engines}
    modules = {module.module_serial: module for module in fleet.modules}
    found = []
    for module in fleet.modules:
        engine = engines.get(module.engine_serial)
        if engine is not None and engine.owner != module.owner:
            where = f"{engine.tail} position {engine.position}" if engine.tail else engine.base or engine.shop
            found.append(
                Elsewhere(
                    module.module_serial,
                    module.owner or OPERATOR,
                    where,
                    engine.engine_serial,
                    engine.owner or OPERATOR,
                    _due(fleet, module.owner, engine.owner, engine.engine_serial, engine.tail),
                )
            )
    for part in fleet.parts:
        held = modules.get(part.module_serial)
        if held is not None and held.owner != part.owner:
            engine = engines.get(held.engine_serial)
            tail = engine.tail if engine else ""
            due = _due(fleet, part.owner, held.owner, held.engine_serial, tail)
            place = held.engine_serial or held.base or held.shop
            mine, theirs = part.owner or OPERATOR, held.owner or OPERATOR
            found.append(Elsewhere(part.part_serial, mine, place, held.module_serial, theirs, due))
    return tuple(sorted(found, key=lambda row: (row.due_back or dt.date.max, row.serial)))


def _due(fleet: Fleet, mine: str, theirs: str, engine: str, tail: str) -> dt.date | None:
    """Return the next return of a lease that parts the two: of what it flies on, or of its own owner."""

    def touches(lease: Lease) -> bool:
        carries = (tail and lease.tail == tail) or (engine and lease.engine_serial == engine)
        return bool(carries) or lease.owner in (mine, theirs)

    days = [lease.return_day for lease in fleet.leases if touches(lease)]
    days += [
        e.lease_in_until_day for e in fleet.engines if e.lease_in_until_day is not None and e.owner in (mine, theirs)
    ]
    return fleet.settings.as_of + dt.timedelta(days=min(days)) if days else None
