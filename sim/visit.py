"""Work on engines and modules: what it books when it begins, and what it changes when it is done."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from sim.draws import normal
from sim.events import KIND
from sim.removal import Removal
from sim.spec import CHECK, LEVELS, RESTORATION, ModuleSpec, ShopSpec
from sim.start import new_factor
from sim.state import EngineState, ModuleState, PartState, early_cycle
from sim.view import Scope
from sim.workscope import PART_CAUSES

if TYPE_CHECKING:
    from sim.world import World

_PART_OFF, _PART_ON, _WORK = (KIND[k] for k in ("part_off", "part_on", "work"))


class Bench:
    """The hands of every shop of one run."""

    __slots__ = ("world",)

    def __init__(self, world: World) -> None:
        self.world = world

    # what is booked at induction ---------------------------------------------------------------------------------

    def book_visit(
        self, engine: EngineState, shop: ShopSpec, scope: Scope, *, begin: float, released: float, removal: Removal
    ) -> None:
        """Book an engine's visit in full: transport, engine level, test, access, work, findings, parts, late credit."""
        world, kind, serial = self.world, engine.spec.engine_type, engine.serial
        item, cost = world.item, world.log.cost
        paid = released + shop.pay_days
        cost(begin, item("transport", "engine", kind, shop.shop), 2.0, serial, shop.shop, begin)
        cost(paid, item("engine_level", kind, scope.visit, shop.shop), 1.0, serial, scope.visit, begin, serial)
        cost(paid, item("test", kind, scope.visit, shop.shop), 1.0, serial, scope.visit, begin, serial)
        for module in engine.modules:
            slot = module.spec.slot
            level = scope.levels[slot]
            if level:
                name = (kind, module.spec.module, LEVELS[level], shop.shop)
                cost(paid, item("access", *name), 1.0, serial, module.spec.module, begin, serial)
                self._book_work(module, name, paid=paid, begin=begin, level=level, engine=serial)
            for i in scope.replace[slot]:
                number = module.parts[i].spec.part_number
                cost(paid, item("part", number), 1.0, module.parts[i].serial, number, begin, serial)
        self._book_late(shop, kind, serial, begin=begin, released=released)

    def _book_work(
        self,
        module: ModuleState,
        name: tuple[str, str, str, str],
        *,
        paid: float,
        begin: float,
        level: int,
        engine: str = "",
    ) -> None:
        world = self.world
        what = f"{name[1]} {name[2]}"
        world.log.cost(paid, world.item("work", *name), 1.0, module.serial, what, begin, engine)
        sigma = module.spec.findings_sigma[level]
        if sigma:
            z = normal(world.module_luck.draw("findings", module.index, module.repairs))
            factor = math.exp(sigma * z - sigma * sigma / 2.0)  # lognormal of mean one
            world.log.cost(paid, world.item("findings", *name), factor - 1.0, module.serial, what, begin, engine)

    def _book_late(self, shop: ShopSpec, kind: str, serial: str, *, begin: float, released: float) -> None:
        if shop.contract_days is not None and released - begin > shop.contract_days:
            late = released - begin - shop.contract_days
            self.world.log.cost(released, self.world.item("late", kind, shop.shop), late, serial, shop.shop, begin)

    def book_repair(
        self,
        module: ModuleState,
        shop: ShopSpec,
        level: int,
        replace: tuple[int, ...],
        *,
        begin: float,
        released: float,
    ) -> None:
        """Book the repair of a module on its own."""
        world, kind = self.world, module.spec.engine_type
        paid = released + shop.pay_days
        world.log.cost(begin, world.item("transport", "module", kind, shop.shop), 2.0, module.serial, shop.shop, begin)
        name = (kind, module.spec.module, LEVELS[level], shop.shop)
        self._book_work(module, name, paid=paid, begin=begin, level=level)
        for i in replace:
            number = module.parts[i].spec.part_number
            world.log.cost(paid, world.item("part", number), 1.0, module.parts[i].serial, number, begin)

    # what is done ------------------------------------------------------------------------------------------------

    def work_on(self, engine: EngineState, scope: Scope, *, day: float) -> None:
        """Carry out a visit: restore modules, replace parts, start the build anew."""
        rating = self.world.matching.rating_of(engine)
        restored = False
        for module in engine.modules:
            level = scope.levels[module.spec.slot]
            if level:
                self.work_on_module(module, level, scope.replace[module.spec.slot], day=day, rating=rating)
                restored = restored or level >= RESTORATION
        engine.csb = 0
        if restored:
            uniform = self.world.engine_luck.draw("margin", engine.index, engine.visits)
            engine.offset_degC = engine.spec.margin_spread[rating] * normal(uniform)

    def work_on_module(
        self, module: ModuleState, level: int, replace: tuple[int, ...], *, day: float, rating: int
    ) -> None:
        """Carry out one level of work and the replacement of parts."""
        world = self.world
        for i in replace:
            self._replace(module, i, day=day, rating=rating)
        if replace:
            module.parts_changed()
        if level >= RESTORATION:
            self._restore(module, level, rating)
        module.repairs += 1
        module.watch_cycles, module.watch_day = -1, math.inf
        world.log.fact(_WORK, day, module.serial, "", LEVELS[level], module.csn, module.hsn)
        self._renew_hazards(module, renewed=module.spec.renews[level])
        self.built_in(module)

    def _restore(self, module: ModuleState, level: int, rating: int) -> None:
        spec: ModuleSpec = module.spec
        law = spec.wear[rating]
        total = module.loss + module.permanent
        if module.first_run:
            module.permanent = min(total, law.unrecoverable)
            module.first_run = False
        module.loss = (total - module.permanent) * (1.0 - spec.restores[level])
        module.csr, module.hsr = 0, 0.0
        module.restorations += 1
        module.factor = new_factor(module, self.world.module_luck)

    def _renew_hazards(self, module: ModuleState, *, renewed: bool) -> None:
        """Draw budgets afresh: all of them after work that renews the hardware, else those that struck or that count
        from the build."""
        hazards = module.hazards()
        if len(module.draws) != len(hazards):
            module.draws = (module.draws + [0] * len(hazards))[: len(hazards)]
            module.budgets = (module.budgets + [0.0] * len(hazards))[: len(hazards)]
        for i, one in enumerate(hazards):
            if renewed or one.counted_from == "build" or module.budgets[i] <= 1e-12:
                module.draws[i] += 1
                uniform = self.world.module_luck.draw(one.cause, module.index, module.draws[i])
                module.budgets[i] = -math.log(uniform)

    def built_in(self, module: ModuleState) -> None:
        """Start a module's count since the build anew, with its chance of an early failure."""
        module.csb, module.hsb = 0, 0.0
        module.built += 1
        uniform = self.world.module_luck.draw("early", module.index, module.built)
        module.early_at = early_cycle(module.spec.early, uniform, 0)

    def _replace(self, module: ModuleState, number: int, *, day: float, rating: int) -> None:
        """Put a new part in the place of an old one; what the old one had left is its stub."""
        world, old = self.world, module.parts[number]
        at = old.epoch_at(day)
        used = sum(old.counts(module.run))
        stub = max(0, old.left(module.run, rating, at))
        root = old.serial.split("~")[0]
        new = PartState(
            f"{root}~{old.builds + 1}",
            old.spec,
            epochs=world.known.new_epochs[old.spec.part_number],
            flown=(0,) * len(old.flown),
            made_day=day,
            owner=old.owner,
        )
        new.builds = old.builds + 1
        new.mark, new.mark_hours = tuple(module.run), module.hsn
        module.parts[number] = new
        world.log.fact(_PART_OFF, day, old.serial, module.serial, str(stub), used, float(stub))
        world.log.fact(_PART_ON, day, new.serial, module.serial, old.spec.part_number)

    def module_scope(
        self, module: ModuleState, removal: Removal, rating: int, goal_cycles: int
    ) -> tuple[int, tuple[int, ...]]:
        """Return the level and the parts to replace for a module that came off by exchange."""
        level = self.least_level(module, removal)
        worn = module.csr / module.spec.interval_cycles
        if removal.cause not in PART_CAUSES or worn >= 0.5:
            level = max(level, RESTORATION)
        day = self.world.env.now
        replace = tuple(
            i
            for i, part in enumerate(module.parts)
            if part.left(module.run, rating, part.epochs[-1] if len(part.epochs) > 1 else part.epoch_at(day))
            < min(goal_cycles, part.epoch_at(day).limits[rating])
        )
        return level, replace

    @staticmethod
    def least_level(module: ModuleState, removal: Removal) -> int:
        """Return the level that a finding asks for at least."""
        if removal.slot != module.spec.slot:
            return CHECK
        return max((one.least_level for one in module.hazards() if one.cause == removal.cause), default=CHECK)
