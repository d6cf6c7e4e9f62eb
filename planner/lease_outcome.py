"""How one engine fares at its lease's return: which conditions it misses, and the money to the operator that day."""

from __future__ import annotations

from collections.abc import Mapping
from typing import NamedTuple

from planner import settlement
from planner.lease_money import Settled, settled
from planner.lease_terms import Measured, measured, short_of, terms_of
from planner.picture import Picture
from sim.fleet import Lease, LeaseTerm
from sim.spec import RESTORATION
from sim.state import EngineState


class Outcome(NamedTuple):
    """One engine at its return: conditions measured, rules of money, and the USD to the operator (negative: to pay)."""

    measured: tuple[Measured, ...]
    settled: tuple[Settled, ...]
    short_usd: Mapping[str, float]
    usd: float

    @property
    def passes(self) -> bool:
        return all(one.short <= 0.0 for one in self.measured)

    @property
    def fails_hard(self) -> bool:
        return any(one.short > 0.0 and one.term.remedy == "hard" for one in self.measured)


def outcome(view: Picture, lease: Lease, engine: EngineState, *, rating: int, away: tuple[str, ...] = ()) -> Outcome:
    """Return how an engine in its state of the day of return fares; ``away`` are own serials that are not on it."""
    day = max(0.0, lease.return_day)
    tail = lease.tail or next(a.tail for a in view.fleet.aircraft if a.engine_type == engine.spec.engine_type)
    found = measured(view, lease, engine, tail=tail, rating=rating, day=day, away=away)
    money = settled(view, lease, engine, rating=rating, day=day)
    missed = [one for one in found if one.short > 0.0]
    hard = [one for one in missed if one.term.remedy == "hard"]
    opened = 0.0
    short_usd: dict[str, float] = {}
    for one in missed:
        if one.term.remedy == "pay_short":
            short = _short_of_all(one.term, engine, rating=rating, day=day, worst=one)
            short_usd[one.term.condition] = settlement.pay_short(short, usd_per_unit=one.term.usd_per_unit_short)
        else:
            work = cure_usd(view, one.term, engine, rating=rating, day=day)
            short_usd[one.term.condition] = settlement.hard(False, visit_usd=work)
    if hard:
        opened = opening_usd(view, engine, day=day)
        first = hard[0].term.condition
        short_usd[first] -= opened
    usd = sum(row.usd for row in money) + sum(short_usd.values())
    return Outcome(found, money, short_usd, usd)


def _short_of_all(term: LeaseTerm, engine: EngineState, *, rating: int, day: float, worst: Measured) -> float:
    """Return the units short over every serial that a condition is measured on."""
    if term.condition == "part_cycles":
        lefts = [max(0, p.left(m.run, rating, p.epoch_at(day))) for m in engine.modules for p in m.parts]
        return sum(short_of(term, float(left)) for left in lefts)
    if term.condition == "hours_since_restoration":
        return sum(short_of(term, m.hsr) for m in engine.modules)
    if term.condition == "cycles_since_restoration":
        return sum(short_of(term, float(m.csr)) for m in engine.modules)
    return worst.short


def cure_usd(view: Picture, term: LeaseTerm, engine: EngineState, *, rating: int, day: float) -> float:
    """Return what the work costs that a failed condition asks for, the opening of the engine not included."""
    kind, price = engine.spec.engine_type, view.price
    shop = view.setup.shops[kind][0].shop

    def restoration(slot: int) -> float:
        name = (kind, engine.spec.modules[slot].module, "restoration", shop)
        return price("work", *name, day=day) + price("access", *name, day=day)

    if term.condition == "part_cycles":
        return sum(
            price("part", p.spec.part_number, day=day)
            for m in engine.modules
            for p in m.parts
            if short_of(term, float(max(0, p.left(m.run, rating, p.epoch_at(day))))) > 0.0
        )
    if term.condition == "hours_since_restoration":
        return sum(restoration(m.spec.slot) for m in engine.modules if short_of(term, m.hsr) > 0.0)
    if term.condition == "cycles_since_restoration":
        return sum(restoration(m.spec.slot) for m in engine.modules if short_of(term, float(m.csr)) > 0.0)
    if term.condition in ("margin", "cycles_to_removal"):
        worst = max(engine.modules, key=lambda m: (m.lost_degC(rating), -m.spec.slot))
        return restoration(worst.spec.slot)
    if term.condition == "own_serials":
        return price("engine_change", kind, day=day)
    return 0.0


def opening_usd(view: Picture, engine: EngineState, *, day: float) -> float:
    """Return what opening an engine in a core visit costs, work on modules not included: the least over the shops."""
    kind, price = engine.spec.engine_type, view.price
    capital = view.world.rate_frac / 365.25 * engine.spec.spare_price_usd
    found = []
    for shop in view.setup.shops[kind]:
        usd = price("engine_level", kind, "core", shop.shop, day=day) + price("test", kind, "core", shop.shop, day=day)
        usd += 2.0 * price("transport", "engine", kind, shop.shop, day=day) + price("engine_change", kind, day=day)
        days = 2.0 * shop.transport_days + (shop.turn["core"].mean_days if "core" in shop.turn else 0.0)
        found.append(usd + days * capital)
    return min(found, default=0.0)


def failing_work(
    view: Picture, lease: Lease, engine: EngineState, *, rating: int, day: float
) -> tuple[tuple[int, ...], tuple[tuple[int, ...], ...]]:
    """Return the least work that makes an engine pass: a level for each module, and the parts to replace in each.

    Conditions of life ask for parts, conditions of age for restorations, a margin for the modules that lost most.
    """
    count = len(engine.modules)
    levels = [0] * count
    replace: list[list[int]] = [[] for _ in range(count)]
    margin_short = 0.0
    for term in terms_of(view, lease, engine.spec.engine_type):
        for m in engine.modules:
            slot = m.spec.slot
            if term.condition == "part_cycles" or term.condition == "cycles_to_removal":
                for number, part in enumerate(m.parts):
                    left = float(max(0, part.left(m.run, rating, part.epoch_at(day))))
                    if short_of(term, left) > 0.0 and number not in replace[slot]:
                        replace[slot].append(number)
            aged = m.hsr if term.condition == "hours_since_restoration" else float(m.csr)
            if term.condition.endswith("since_restoration") and short_of(term, aged) > 0.0:
                levels[slot] = RESTORATION
        if term.condition == "margin":
            margin_short = max(margin_short, short_of(term, engine.margin_degC(rating)))
    _buy(engine, levels, margin_short, rating)
    return tuple(levels), tuple(tuple(one) for one in replace)


def _buy(engine: EngineState, levels: list[int], short_degC: float, rating: int) -> None:
    """Restore the modules that lost most until the margin is expected to be enough."""
    gain = sum(_gain(engine, slot, rating) for slot, level in enumerate(levels) if level >= RESTORATION)
    order = sorted(range(len(levels)), key=lambda slot: (-_gain(engine, slot, rating), slot))
    for slot in order:
        if gain >= short_degC or _gain(engine, slot, rating) <= 0.0:
            return
        if levels[slot] < RESTORATION:
            levels[slot] = RESTORATION
            gain += _gain(engine, slot, rating)


def _gain(engine: EngineState, slot: int, rating: int) -> float:
    module = engine.modules[slot]
    law = module.spec.wear[rating]
    stays = law.unrecoverable if module.first_run else module.permanent
    lost = module.loss + module.permanent
    return module.spec.restores[RESTORATION] * max(0.0, lost - stays) * law.unit_degC
