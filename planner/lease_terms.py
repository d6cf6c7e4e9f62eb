"""The conditions of a lease at its return, measured on an engine: the worst value, on which serial, passed or not.

Values are oriented as the terms write them (``least`` wants more, ``most`` wants less); *short* is by how much the
worst serial misses the condition, 0 when it passes. Margin is the hot-day margin at the rating flown, without wash.
"""

from __future__ import annotations

import math
from typing import NamedTuple

from planner.picture import Picture, foreseen
from sim.fleet import Lease, LeaseTerm
from sim.state import EngineState

UNITS = {
    "part_cycles": "cycles left",
    "hours_since_restoration": "h since restoration",
    "cycles_since_restoration": "cycles since restoration",
    "margin": "degC",
    "cycles_to_removal": "cycles to the next removal",
    "own_serials": "serials away",
    "papers": "parts without papers",
}


class Measured(NamedTuple):
    """One condition on one engine: the worst value and its serial, and by how much it misses (0: passed)."""

    term: LeaseTerm
    value: float
    serial: str
    short: float


def terms_of(view: Picture, lease: Lease, kind: str) -> tuple[LeaseTerm, ...]:
    """Return the conditions of a lease's terms for an engine type, in the order of the table."""
    return tuple(row for row in view.fleet.lease_terms if row.terms == lease.terms and row.engine_type == kind)


def measured(
    view: Picture, lease: Lease, engine: EngineState, *, tail: str, rating: int, day: float, away: tuple[str, ...] = ()
) -> tuple[Measured, ...]:
    """Return every condition measured on an engine in its state of ``day``; ``away`` are own serials not on it."""
    found = []
    for term in terms_of(view, lease, engine.spec.engine_type):
        values = _values(view, term, engine, tail=tail, rating=rating, day=day, away=away)
        if values:
            worst = max(values, key=lambda one: (short_of(term, one[0]), -_slack(term, one[0])))
            found.append(Measured(term, worst[0], worst[1], short_of(term, worst[0])))
    return tuple(found)


def short_of(term: LeaseTerm, value: float) -> float:
    """Return by how many units a value misses a condition."""
    most = 0.0 if term.most is None and term.condition in ("own_serials", "papers") else term.most
    low = 0.0 if term.least is None else term.least - value
    high = 0.0 if most is None else value - most
    return max(0.0, low, high)


def wanted_text(term: LeaseTerm) -> str:
    """Return what a condition asks for, in words."""
    unit = UNITS[term.condition]
    parts = []
    if term.least is not None:
        parts.append(f"at least {term.least:,.0f} {unit}")
    if term.most is not None:
        parts.append(f"at most {term.most:,.0f} {unit}")
    return " and ".join(parts) or ("own serials back" if term.condition == "own_serials" else "papers complete")


def _slack(term: LeaseTerm, value: float) -> float:
    """Return by how much a value passes (for telling the worst of those that all pass)."""
    low = math.inf if term.least is None else value - term.least
    high = math.inf if term.most is None else term.most - value
    return min(low, high)


def _values(
    view: Picture, term: LeaseTerm, engine: EngineState, *, tail: str, rating: int, day: float, away: tuple[str, ...]
) -> list[tuple[float, str]]:
    if term.condition == "part_cycles":
        return [
            (float(max(0, p.left(m.run, rating, p.epoch_at(day)))), p.serial) for m in engine.modules for p in m.parts
        ]
    if term.condition == "hours_since_restoration":
        return [(m.hsr, m.serial) for m in engine.modules]
    if term.condition == "cycles_since_restoration":
        return [(float(m.csr), m.serial) for m in engine.modules]
    if term.condition == "margin":
        return [(engine.margin_degC(rating), engine.serial)]
    if term.condition == "cycles_to_removal":
        return [(float(foreseen(view, engine, tail, day=day).cycles), engine.serial)]
    if term.condition == "own_serials":
        return [(float(len(away)), away[0] if away else engine.serial)]
    bad = [p.serial for m in engine.modules for p in m.parts if not p.known]
    return [(float(len(bad)), bad[0] if bad else engine.serial)]
