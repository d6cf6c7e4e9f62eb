"""A lease's return: what the settlement counts, and whether the aircraft leaves.

Settlements (common practice, no source; worked cases in tests): half life pays for each event the missing share below
one half, and earns what is above; full life pays all that is used; a mirror pays the difference to the state at
delivery, one way or both; short units are paid at their price; a hard condition that fails asks for the work itself.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from typing import TYPE_CHECKING

from sim.fleet import Lease, LeaseSettlement, LeaseTerm
from sim.state import EngineState, ModuleState
from sim.valuation import module_fraction

if TYPE_CHECKING:
    from sim.aircraft import AircraftProcess
    from sim.world import World


def settle(world: World, aircraft: AircraftProcess) -> bool:
    """Settle the lease of an aircraft that is due; return whether the aircraft leaves the fleet."""
    lease = next((one for one in world.setup.fleet.leases if one.tail == aircraft.row.tail), None)
    if lease is None:
        return False
    aircraft.return_day = math.inf
    if lease.after_return == "extend":
        return False
    day = world.env.now
    for engine in aircraft.engines:
        if engine is None or engine.leased:
            continue
        for key, amount in amounts(world, lease, engine, aircraft):
            if amount:
                world.log.cost(day, world.item(*key), amount, engine.serial, lease.lease)
    return lease.after_return == "leave"


def amounts(
    world: World, lease: Lease, engine: EngineState, aircraft: AircraftProcess
) -> Iterator[tuple[tuple[str, ...], float]]:
    """Yield (item key, amount) of every rule of a lease's terms for one engine."""
    kind, day = engine.spec.engine_type, world.env.now
    for rule in world.setup.fleet.lease_settlements:
        if rule.terms == lease.terms and rule.engine_type == kind:
            grown = (1.0 + rule.escalation_frac) ** (day / 365.25)
            yield (
                ("settlement", rule.terms, kind, rule.event, rule.basis),
                grown * _ruled(world, lease, rule, engine, aircraft),
            )
    for term in world.setup.fleet.lease_terms:
        if term.terms == lease.terms and term.engine_type == kind and term.remedy == "pay_short":
            yield ("short", term.terms, kind, term.condition), _short(term, engine, aircraft, day)


def _ruled(world: World, lease: Lease, rule: LeaseSettlement, engine: EngineState, aircraft: AircraftProcess) -> float:
    modules = [m for m in engine.modules if rule.event in (m.spec.module, "engine")]
    rating, day = aircraft.flying.rating, world.env.now
    if rule.event == "parts":
        lefts = [p.fraction_left(m.run, rating, day) for m in engine.modules for p in m.parts]
    elif rule.expected_interval:
        used = [(m.hsr if rule.clock == "hours" else m.csr) / rule.expected_interval for m in modules]
        lefts = [max(0.0, 1.0 - one) for one in used]
    else:
        lefts = [module_fraction(m) for m in modules]
    if not lefts:
        return 0.0
    if rule.basis == "half_life":
        return sum(0.5 - left for left in lefts)
    if rule.basis == "full_life":
        return sum(1.0 - left for left in lefts)
    if rule.basis in ("mirror_one_way", "mirror_two_way"):
        worse = sum(_worse_than_delivered(world, lease, m, rule) for m in modules)
        return max(0.0, worse) if rule.basis == "mirror_one_way" else worse
    return 0.0


def _worse_than_delivered(world: World, lease: Lease, module: ModuleState, rule: LeaseSettlement) -> float:
    """Return by how many units (hours or cycles since restoration) a module is worse than it was delivered."""
    for row in world.setup.fleet.lease_delivery:
        if row.lease == lease.lease and row.serial == module.serial:
            now = module.hsr if rule.clock == "hours" else float(module.csr)
            return now - (row.hours_since_restoration or 0.0)
    return 0.0


def _short(term: LeaseTerm, engine: EngineState, aircraft: AircraftProcess, day: float) -> float:
    """Return by how many units a condition is missed, summed over what it is measured on."""
    rating = aircraft.flying.rating
    if term.condition == "part_cycles":
        values = [float(p.left(m.run, rating, p.epoch_at(day))) for m in engine.modules for p in m.parts]
    elif term.condition == "hours_since_restoration":
        values = [m.hsr for m in engine.modules]
    elif term.condition == "cycles_since_restoration":
        values = [float(m.csr) for m in engine.modules]
    elif term.condition == "margin":
        values = [engine.margin_degC(rating)]
    else:
        return 0.0
    short = 0.0
    for value in values:
        if term.least is not None:
            short += max(0.0, term.least - value)
        if term.most is not None:
            short += max(0.0, value - term.most)
    return short
