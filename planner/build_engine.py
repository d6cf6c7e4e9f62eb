"""One engine of the fleet as a build problem: lives, wear, prices and the end of its plan, as functions of cycles.

The plan runs to the lease return or exit, or to the horizon. At the horizon life left is worth its share of the price;
at a return it is worth what the lease's rules pay, and a hard condition that fails costs the work that cures it.
Wear is the expected one; chance causes whose age a restoration sets back count as expected openings.
"""

from __future__ import annotations

import math
from collections.abc import Callable
from functools import cache
from typing import NamedTuple

from planner.build_points import BuildModule, BuildPart, BuildProblem, Money, UsedPart
from planner.lease_ends import ModuleEnd, PartEnd, end_budget_degC, module_end, part_end
from planner.part_reach import reach_cycles
from planner.picture import DAYS_PER_YEAR, Picture, flying_on
from planner.planned_use import PlannedUse
from sim import hazard
from sim.errors import RequestError
from sim.fleet import Lease, Part
from sim.spec import LEVELS, RESTORATION, ShopSpec
from sim.start import part_state
from sim.state import EngineState, ModuleState, PartState
from sim.wear import gained


class Planned(NamedTuple):
    """An engine's build problem, and what is needed to tell its answer: the tail, its use, the end, shop, states."""

    problem: BuildProblem
    view: Picture
    engine: EngineState
    tail: str
    use: PlannedUse
    end_day: float
    end_why: str
    shop: ShopSpec
    parts: tuple[tuple[ModuleState, PartState], ...]


def plan_end(view: Picture, engine: EngineState, tail: str) -> tuple[float, str, Lease | None]:
    """Return the day on which an engine's plan on a tail ends, why, and the lease that is settled then.

    A tail's lease ends the plan of the engines that are its owner's; others stay in the fleet and go on.
    """
    horizon = view.fleet.settings.horizon_years * DAYS_PER_YEAR
    ends: list[tuple[float, str, Lease | None]] = [(horizon, "horizon", None)]
    for lease in view.fleet.leases:
        ours = lease.engine_serial == engine.serial or (
            lease.tail == tail and tail != "" and engine.owner in ("", lease.owner)
        )
        if ours and lease.after_return != "extend":
            ends.append((lease.return_day, "lease return", lease))
    exit_day = view.tails[tail].row.exit_day
    if exit_day is not None:
        ends.append((exit_day, "exit", None))
    return min(ends, key=lambda one: one[0])


def problem_for(view: Picture, engine: EngineState, tail: str, *, open_now: bool, slot: int = -1) -> Planned:
    """Return the build problem of an engine on a tail from the as-of date on.

    ``open_now``: it is open today, with the module of ``slot`` exposed. Raises RequestError when the plan has no time.
    """
    use = view.uses[tail]
    end_day, why, lease = plan_end(view, engine, tail)
    end = float(use.whole_cycles(end_day))
    if end < 1:
        raise RequestError(
            "build plan", f"{tail} ends on {view.setup.season.date(end_day)}", "a day after the as-of date"
        )
    made = _Maker(view, engine, tail, end=end, end_day=end_day, lease=lease)
    problem = BuildProblem(
        modules=tuple(made.module(module) for module in engine.modules),
        parts=tuple(made.part(module, part) for module in engine.modules for part in module.parts),
        end_cycles=end,
        visit=made.visit,
        budget_degC=made.budget_degC,
        end_budget_degC=made.end_budget_degC(),
        must_visit=open_now,
        must_open=(slot,) if open_now and slot >= 0 else (),
    )
    parts = tuple((module, part) for module in engine.modules for part in module.parts)
    return Planned(problem, view, engine, tail, use, end_day, why, made.shop, parts)


class _Maker:
    """Prices and curves of one engine on one tail."""

    def __init__(
        self, view: Picture, engine: EngineState, tail: str, *, end: float, end_day: float, lease: Lease | None
    ) -> None:
        self.view, self.engine, self.tail, self.end, self.end_day, self.lease = view, engine, tail, end, end_day, lease
        self.use, self.spec = view.uses[tail], engine.spec
        self.flying = flying_on(view, tail, day=0.0)
        self.shop = min(view.setup.shops[self.spec.engine_type], key=lambda shop: (self._visit_usd(shop), shop.shop))
        self.gate = _gate(engine)
        self.item = cache(self._item)

    def _item(self, key: tuple[str, ...], cycles: float) -> float:
        day = self.use.day(cycles)
        return self.view.price(*key, day=day) * self.view.discount(day)

    def _visit_usd(self, shop: ShopSpec, *, visit: str = "core", day: float = 0.0) -> float:
        """Return what one kind of visit costs that no module carries, days without the engine included."""
        kind, price = self.spec.engine_type, self.view.price
        usd = price("engine_level", kind, visit, shop.shop, day=day) + price("test", kind, visit, shop.shop, day=day)
        usd += 2.0 * price("transport", "engine", kind, shop.shop, day=day) + price("engine_change", kind, day=day)
        turn = shop.turn[visit].mean_days if visit in shop.turn else 0.0
        capital = self.view.world.rate_frac / DAYS_PER_YEAR * self.spec.spare_price_usd
        return usd + (turn + 2.0 * shop.transport_days) * capital

    def visit(self, cycles: float) -> float:
        """Return the present cost of an opening at a cycle: a quick visit, or a core visit where no gate tells them."""
        day = self.use.day(cycles)
        kind = "core" if self.gate is None else "quick"
        return self._visit_usd(self.shop, visit=kind, day=day) * self.view.discount(day)

    def module(self, module: ModuleState) -> BuildModule:
        """Return one module: opening it (with its check, and for the gate of the core the dearer visit), wear, risk."""
        name, kind, shop = module.spec.module, self.spec.engine_type, self.shop.shop
        gate = module.spec.slot == self.gate
        law, factor = module.spec.wear, self.flying.wear_factor

        def opened(cycles: float) -> float:
            usd = self.item(("access", kind, name, "check", shop), cycles)
            usd += self.item(("work", kind, name, "check", shop), cycles)
            if gate:
                day = self.use.day(cycles)
                more = self._visit_usd(self.shop, visit="core", day=day)
                usd += (more - self._visit_usd(self.shop, visit="quick", day=day)) * self.view.discount(day)
            return usd

        def restored(cycles: float) -> float:
            levels = [self.item((what, kind, name, LEVELS[RESTORATION], shop), cycles) for what in ("work", "access")]
            return sum(levels) - sum(
                self.item((what, kind, name, "check", shop), cycles) for what in ("work", "access")
            )

        def degrees(units: float, at: float) -> float:
            return units * law[self._rating(at)].unit_degC

        def loss_now(cycles: float) -> float:
            rating, hours = self._rating(cycles), self.use.at_cycles(cycles).hours_per_cycle
            more = factor * gained(law[rating], module.csr, cycles, hours)
            return degrees(module.loss + module.permanent + more, cycles)

        stays = law[self.flying.rating].unrecoverable if module.first_run else module.permanent
        left_over = module.loss * (1.0 - module.spec.restores[RESTORATION])

        def loss_after(cycles: float) -> float:
            return degrees(stays + left_over + factor * gained(law[self.flying.rating], 0.0, cycles, self._hours), 0.0)

        return BuildModule(
            module=name,
            module_serial=module.serial,
            in_front=module.spec.behind,
            open=opened,
            restore=restored,
            age_cycles=float(module.csr),
            loss_now=loss_now,
            loss_after=loss_after,
            end=self._module_end(module),
            risk=lambda age: _risk(module, age, hours=self._hours, environment=self.flying.environment),
            risk_usd=lambda cycles: self.visit(cycles) + opened(cycles),
        )

    @property
    def _hours(self) -> float:
        return self.flying.hours_per_cycle

    def _rating(self, cycles: float) -> int:
        return self.spec.ratings.index(self.use.at_cycles(cycles).rating)

    def part(self, module: ModuleState, part: PartState) -> BuildPart:
        """Return one part, with the used ones of its number that can be had."""
        number = part.spec.part_number
        new = PartState("new", part.spec, epochs=self.view.world.known.new_epochs[number], flown=(0,) * len(part.flown))
        new.mark, new.mark_hours = tuple(module.run), module.hsn
        return BuildPart(
            part_serial=part.serial,
            part_number=number,
            module=module.spec.slot,
            left_cycles=reach_cycles(part, module, self.use, ratings=self.spec.ratings),
            life=self._life(new, module),
            price=lambda cycles: self.item(("part", number), cycles),
            end=self._part_end(module, part),
            used=tuple(self._used(row, module) for row in _to_be_had(self.view, number)),
        )

    def _life(self, part: PartState, module: ModuleState) -> Callable[[float], float]:
        @cache
        def life(start: float) -> float:
            return float(reach_cycles(part, module, self.use, ratings=self.spec.ratings, start=start))

        return life

    def _used(self, row: Part, module: ModuleState) -> UsedPart:
        state = part_state(row, self.view.setup, self.view.world.known)
        state.mark, state.mark_hours = tuple(module.run), module.hsn
        worth = state.fraction_left(module.run, self.flying.rating, 0.0)
        asked = row.asking_price_usd

        def price(cycles: float) -> float:
            if asked is None or row.place != "market":
                return worth * self.item(("part", row.part_number), cycles)
            return asked * self.view.discount(self.use.day(cycles))

        ready = self.use.cycles(max(0.0, row.ready_day or 0.0))
        return UsedPart(row.part_serial, self._life(state, module), price, ready)

    def _part_end(self, module: ModuleState, part: PartState) -> Money:
        rating, worth = self._rating(self.end), self.view.discount(self.end_day)
        end: PartEnd = part_end(self.view, self.lease, module, part, rating=rating, day=self.end_day)
        return lambda left: end(left) * worth

    def _module_end(self, module: ModuleState) -> Money:
        worth = self.view.discount(self.end_day)
        end: ModuleEnd = module_end(self.view, self.lease, module, hours_per_cycle=self._hours, day=self.end_day)
        return lambda age: end(age) * worth

    def budget_degC(self, cycles: float) -> float:
        """Return the loss that uses up the margin at a cycle: from a new engine's margin, washes at their least."""
        above = self.spec.new_margin[self._rating(cycles)] + self.engine.offset_degC - self.spec.removal_margin
        wash = self.flying.wash
        return above + (wash[0] * 0.5 ** (wash[2] / wash[1]) if wash else 0.0)

    def end_budget_degC(self) -> float | None:
        """Return what may be lost at a return that asks for margin; None where nothing is asked."""
        if self.lease is None:
            return None
        new = self.spec.new_margin[self._rating(self.end)] + self.engine.offset_degC
        return end_budget_degC(self.view, self.lease, self.spec.engine_type, new_margin_degC=new)


def _gate(engine: EngineState) -> int | None:
    """Return the core module that stands in front of all others of the core: opening it makes a visit a core visit."""
    for slot in engine.spec.core:
        others = [other for other in engine.spec.core if other != slot]
        if all(slot in engine.spec.modules[other].behind for other in others):
            return slot
    return None


def _risk(module: ModuleState, age: float, *, hours: float, environment: float) -> float:
    """Return the hazard gathered up to an age in cycles since restoration, of causes that a restoration sets back."""
    total = 0.0
    for one in module.hazards():
        if one.counted_from != "restoration" or one.shape == 1.0 or not math.isfinite(one.scale):
            continue
        scale = hazard.scale_in(environment, one.scale, one.exponent)
        total += hazard.cumulative(age * hours if one.hours else age, one.shape, scale)
    return total


def _to_be_had(view: Picture, number: str) -> list[Part]:
    """Return parts of a number in no module whose life is proven: on a shelf, on order, or on the market."""
    return [
        row
        for row in view.fleet.parts
        if row.part_number == number
        and not row.module_serial
        and row.life_known
        and row.place in ("shelf", "order", "market")
    ]
