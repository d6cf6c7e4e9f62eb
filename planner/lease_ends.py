"""What life left at the end of an engine's plan is worth: its share of the price, or what a lease's rules pay."""

from __future__ import annotations

from collections.abc import Callable

from planner.lease_money import module_settled, part_settled
from planner.lease_terms import short_of, terms_of
from planner.picture import Picture
from sim.fleet import Lease, LeaseTerm
from sim.state import ModuleState, PartState

PartEnd = Callable[[float], float]  # cycles left at the end -> USD of that day
ModuleEnd = Callable[[float], float]  # cycles since restoration at the end -> USD of that day


def part_end(
    view: Picture, lease: Lease | None, module: ModuleState, part: PartState, *, rating: int, day: float
) -> PartEnd:
    """Return the worth of a part at the end of the plan by cycles left at the rating flown then."""
    number = part.spec.part_number
    limit = float(part.epoch_at(day).limits[rating]) or 1.0
    price = view.price("part", number, day=day)
    if lease is None:
        return lambda left: price * min(1.0, max(0.0, left) / limit)
    kind = module.spec.engine_type
    terms = [t for t in terms_of(view, lease, kind) if t.condition in ("part_cycles", "cycles_to_removal")]
    cure = price + view.price("engine_level", kind, "quick", _any_shop(view, kind), day=day)

    def settled(left: float) -> float:
        usd = sum(one.usd for one in part_settled(view, lease, part, left=left, limit=limit, day=day))
        return usd - sum(_missed(term, left, cure) for term in terms)

    return settled


def module_end(
    view: Picture, lease: Lease | None, module: ModuleState, *, hours_per_cycle: float, day: float
) -> ModuleEnd:
    """Return the worth of a module at the end of the plan by cycles since its restoration."""
    spec = module.spec
    full = view.price("life", "start", spec.engine_type, spec.module, day=day)
    hours_now, cycles_now = module.hsr, float(module.csr)

    def hours(age: float) -> float:
        # a run that is under way keeps the hours on record; a later one has the tail's hours a cycle
        return hours_now + (age - cycles_now) * hours_per_cycle if age >= cycles_now > 0 else age * hours_per_cycle

    if lease is None:
        return lambda age: full * max(0.0, 1.0 - max(age / spec.interval_cycles, hours(age) / spec.interval_hours))
    terms = terms_of(view, lease, spec.engine_type)

    def settled(age: float) -> float:
        rows = module_settled(view, lease, module, hours=hours(age), cycles=age, day=day)
        usd = sum(one.usd for one in rows)
        for term in terms:
            if term.condition == "hours_since_restoration":
                usd -= _missed(term, hours(age), full)
            elif term.condition == "cycles_since_restoration":
                usd -= _missed(term, age, full)
        return usd

    return settled


def end_budget_degC(view: Picture, lease: Lease, kind: str, *, new_margin_degC: float) -> float | None:
    """Return the loss that a lease still allows at the return (hard or paid alike); None when it asks for no margin."""
    wanted = [t.least for t in terms_of(view, lease, kind) if t.condition == "margin" and t.least is not None]
    return new_margin_degC - max(wanted) if wanted else None


def _missed(term: LeaseTerm, value: float, cure_usd: float) -> float:
    """Return what missing a condition costs: each unit short at its price, or the work that cures it."""
    short = short_of(term, value)
    if short <= 0.0:
        return 0.0
    return short * term.usd_per_unit_short if term.remedy == "pay_short" else cure_usd


def _any_shop(view: Picture, kind: str) -> str:
    return min(shop.shop for shop in view.setup.shops[kind])
