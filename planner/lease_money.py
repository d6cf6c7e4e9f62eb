"""Money at a lease's return for one serial: the rules of its terms applied to what the serial has left.

Amounts are USD to the operator (negative: to pay) at the day of return, not discounted. Rates and event costs rise from
the as-of date by the rule's own escalation; parts without an agreed event cost count at their list price. What a serial
had left at delivery comes from ``lease_delivery``; a serial without a row counts as delivered at half of its life.
"""

from __future__ import annotations

from typing import NamedTuple

from planner import settlement
from planner.picture import DAYS_PER_YEAR, Picture
from sim.fleet import Lease, LeaseSettlement
from sim.state import EngineState, ModuleState, PartState


class Settled(NamedTuple):
    """One rule of money for one serial: what it counts, in which unit, and the USD to the operator."""

    event: str
    basis: str
    serial: str
    at_return: float
    unit: str
    usd: float


def settled(view: Picture, lease: Lease, engine: EngineState, *, rating: int, day: float) -> tuple[Settled, ...]:
    """Return every rule of a lease's terms for one engine in its state of the day of return."""
    found: list[Settled] = []
    for module in engine.modules:
        found += module_settled(view, lease, module, hours=module.hsr, cycles=float(module.csr), day=day)
        for part in module.parts:
            at = part.epoch_at(day)
            left = max(0, part.left(module.run, rating, at))
            found += part_settled(view, lease, part, left=left, limit=at.limits[rating], day=day)
    return tuple(found)


def module_settled(
    view: Picture, lease: Lease, module: ModuleState, *, hours: float, cycles: float, day: float
) -> list[Settled]:
    """Return the rules for one module that has flown so many hours and cycles since its restoration."""
    found = []
    for rule in _rules(view, lease, module.spec.engine_type):
        if rule.event not in (module.spec.module, "engine") or rule.basis in ("hard", "pay_short", "reserves"):
            continue
        used, unit = (hours, "h") if rule.clock == "hours" else (cycles, "cycles")
        grown = (1.0 + rule.escalation_frac) ** (day / DAYS_PER_YEAR)
        if rule.basis in ("half_life", "full_life"):
            interval = rule.expected_interval or _interval(module, rule.clock)
            share = settlement.Share(
                settlement.left_frac(used, expected_interval=interval), rule.event_cost_usd * grown
            )
            usd = settlement.half_life([share]) if rule.basis == "half_life" else settlement.full_life([share])
        else:
            delivered = _delivered(view, lease, module.serial)
            began = delivered[1] if delivered and delivered[1] is not None else _interval(module, rule.clock) / 2.0
            usd = settlement.mirror(
                -used,
                left_at_delivery=-began,
                usd_per_unit=rule.rate_usd * grown,
                two_way=rule.basis == "mirror_two_way",
            )
        found.append(Settled(rule.event, rule.basis, module.serial, used, f"{unit} since restoration", usd))
    return found


def part_settled(
    view: Picture, lease: Lease, part: PartState, *, left: float, limit: float, day: float
) -> list[Settled]:
    """Return the rules for one part that has so many cycles left of its limit at the rating flown."""
    found = []
    number = part.spec.part_number
    kind = next(p.engine_type for p in view.fleet.part_types if p.part_number == number)
    for rule in _rules(view, lease, kind):
        if rule.event != "parts" or rule.basis in ("hard", "pay_short", "reserves"):
            continue
        grown = (1.0 + rule.escalation_frac) ** (day / DAYS_PER_YEAR)
        price = rule.event_cost_usd * grown if rule.event_cost_usd else view.price("part", number, day=day)
        share = settlement.Share(min(1.0, max(0.0, left) / limit) if limit else 0.0, price)
        if rule.basis == "half_life":
            usd = settlement.half_life([share])
        elif rule.basis == "full_life":
            usd = settlement.full_life([share])
        else:
            delivered = _delivered(view, lease, part.serial)
            began = delivered[0] if delivered and delivered[0] is not None else limit / 2.0
            rate = rule.rate_usd * grown if rule.rate_usd else price / limit if limit else 0.0
            usd = settlement.mirror(
                left, left_at_delivery=began, usd_per_unit=rate, two_way=rule.basis == "mirror_two_way"
            )
        found.append(Settled("parts", rule.basis, part.serial, left, "cycles left", usd))
    return found


def _rules(view: Picture, lease: Lease, kind: str) -> list[LeaseSettlement]:
    return [r for r in view.fleet.lease_settlements if r.terms == lease.terms and r.engine_type == kind]


def _interval(module: ModuleState, clock: str) -> float:
    """Return the type's expected interval of a restoration on a clock, or the other clock's where it has none."""
    hours, cycles = module.spec.interval_hours, module.spec.interval_cycles
    wanted, other = (hours, cycles) if clock == "hours" else (cycles, hours)
    return wanted if wanted < float("inf") else other


def _delivered(view: Picture, lease: Lease, serial: str) -> tuple[float | None, float | None] | None:
    for row in view.fleet.lease_delivery:
        if row.lease == lease.lease and row.serial == serial:
            return (None if row.cycles_left is None else float(row.cycles_left), row.hours_since_restoration)
    return None
