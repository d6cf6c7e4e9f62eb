"""Whose serials fly where: engines, modules and parts that fly on another owner's, and what must come home before when.

A serial belongs where its lease's delivery list says; without a row, to a tail of a lease of its owner whose return
comes first. A blank owner is the operator's own.
"""

from __future__ import annotations

import datetime as dt
from typing import Any, NamedTuple

from sim.fleet import Fleet, Lease

Row = dict[str, Any]


class _Flying(NamedTuple):
    """A serial, its owner, what it is in, that one's owner, and the tail."""

    serial: str
    owner: str
    inside: str
    host_owner: str
    tail: str


def owners(fleet: Fleet, *, lease: str | None = None) -> list[Row]:
    """Return every serial that flies on what another owns, the first due first; ``lease`` keeps those of one lease."""
    rows = []
    for one in _strangers(fleet):
        home = _home(fleet, one)
        due = home.return_day if home is not None else None
        if due is None:
            due = next((e.lease_in_until_day for e in fleet.engines if e.engine_serial == one.serial), None)
        rows.append((due if due is not None else float("inf"), one, home))
    rows.sort(key=lambda row: (row[0], row[1].serial))
    return [_row(fleet, one, home, due) for due, one, home in rows if lease is None or (home and home.lease == lease)]


def _row(fleet: Fleet, one: _Flying, home: Lease | None, due: float) -> Row:
    ours = "the operator"
    back = fleet.settings.as_of + dt.timedelta(days=int(due)) if due < float("inf") else None
    place = f"{one.inside} on {one.tail}" if one.tail and one.inside != one.tail else one.inside
    return {
        "serial": one.serial,
        "owner": one.owner or ours,
        "flies_on": place,
        "due_back": back,
        "lease": home.lease if home else "",
        "belongs_to": (home.tail or home.engine_serial) if home else "",
        "reason": f"is {_whose(one.owner)}, what it flies on is {_whose(one.host_owner)}",
    }


def _whose(owner: str) -> str:
    return f"{owner}'s" if owner else "the operator's"


def _strangers(fleet: Fleet) -> list[_Flying]:
    """Return the serials whose owner is not that of what they are in."""
    tail_owner = {a.tail: a.owner for a in fleet.aircraft}
    leased = {lease.tail: lease.owner for lease in fleet.leases if lease.tail}
    engines = {e.engine_serial: e for e in fleet.engines}
    modules = {m.module_serial: m for m in fleet.modules}
    found = []
    for engine in fleet.engines:
        if engine.tail:
            owner = leased.get(engine.tail) or tail_owner.get(engine.tail, "")
            found.append(_Flying(engine.engine_serial, engine.owner, engine.tail, owner, engine.tail))
    for module in fleet.modules:
        if module.engine_serial in engines:
            host = engines[module.engine_serial]
            found.append(_Flying(module.module_serial, module.owner, host.engine_serial, host.owner, host.tail))
    for part in fleet.parts:
        if part.module_serial in modules:
            host_module = modules[part.module_serial]
            tail = engines[host_module.engine_serial].tail if host_module.engine_serial in engines else ""
            found.append(_Flying(part.part_serial, part.owner, host_module.module_serial, host_module.owner, tail))
    return [one for one in found if one.owner != one.host_owner]


def _home(fleet: Fleet, one: _Flying) -> Lease | None:
    delivered = {row.lease for row in fleet.lease_delivery if row.serial == one.serial}
    leases = [lease for lease in fleet.leases if lease.lease in delivered]
    if not leases and one.owner:
        leases = [lease for lease in fleet.leases if lease.owner == one.owner]
    if not leases and one.host_owner:
        # the operator's own serial leaves with the lease of what it is in
        leases = [lease for lease in fleet.leases if lease.tail == one.tail and one.tail]
    return min(leases, key=lambda lease: (lease.return_day, lease.lease), default=None)
