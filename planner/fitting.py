"""The values that the fit rules look at, gathered from a fleet: the module offered and the place that receives it."""

from __future__ import annotations

import math
from collections.abc import Iterable
from typing import TypeVar

from sim import life
from sim.errors import RequestError
from sim.fit_rules import FitPart, Mates, Offered, Receiver, Refusal, mates_of, may_fit
from sim.fleet import Fleet, Module, Part

Item = TypeVar("Item")


class Fitting:
    """The fit rules over one fleet; tables are indexed once."""

    __slots__ = ("_aircraft", "_engines", "_fleet", "_limits", "_modules", "_modules_of", "_numbers", "_parts", "mates")

    def __init__(self, fleet: Fleet) -> None:
        self._fleet = fleet
        self._modules = {module.module_serial: module for module in fleet.modules}
        self._engines = {engine.engine_serial: engine for engine in fleet.engines}
        self._aircraft = {aircraft.tail: aircraft for aircraft in fleet.aircraft}
        self._numbers = {row.part_number: row for row in fleet.part_types}
        self._parts = _grouped((part.module_serial, part) for part in fleet.parts)
        self._modules_of = _grouped((module.engine_serial, module) for module in fleet.modules)
        self._limits = _grouped((limit.part_number, limit) for limit in fleet.part_limits)
        self.mates: Mates = mates_of(fleet.standards)

    def refusals(
        self,
        module_serial: str,
        engine_serial: str,
        *,
        tail: str | None = None,
        day: float = 0.0,
        least_cycles: int = 1,
        worked_on_beside: tuple[str, ...] = (),
        out: frozenset[str] = frozenset(),
    ) -> tuple[Refusal, ...]:
        """Return why a module may not go on an engine; empty when it may.

        ``tail`` is the aircraft it is to fly on (None: where the engine hangs; blank: the least of the type's ratings),
        ``out`` names module serials that leave the engine too and are no neighbours. Raises RequestError for unknown
        serials.
        """
        module = self._module(module_serial)
        receiver = self.receiver(engine_serial, module.module, tail=tail, out=out, worked_on_beside=worked_on_beside)
        offered = self.offered(module_serial, rating=receiver.rating, day=day)
        return may_fit(offered, receiver, mates=self.mates, day=day, least_cycles=least_cycles)

    def offered(self, module_serial: str, *, rating: str, day: float = 0.0) -> Offered:
        """Return a module as the rules see it, its parts' life counted at a rating on a day."""
        module = self._module(module_serial)
        return Offered(
            module_serial=module.module_serial,
            engine_type=module.engine_type,
            module=module.module,
            standard=module.standard,
            owner=module.owner,
            exchange_rule=self._rule_of(module.engine_serial),
            parts=tuple(self._part(part, rating, day) for part in self._parts.get(module_serial, ())),
        )

    def receiver(
        self,
        engine_serial: str,
        module: str,
        *,
        tail: str | None = None,
        out: frozenset[str] = frozenset(),
        worked_on_beside: tuple[str, ...] = (),
    ) -> Receiver:
        """Return an engine's place for a module as the rules see it."""
        if engine_serial not in self._engines:
            raise RequestError("engine", engine_serial, "an engine of the fleet")
        engine = self._engines[engine_serial]
        on = engine.tail if tail is None else tail
        if on and on not in self._aircraft:
            raise RequestError("tail", on, "an aircraft of the fleet")
        ratings = tuple(row.rating for row in self._fleet.ratings if row.engine_type == engine.engine_type)
        aircraft = self._aircraft.get(on)
        leases = [
            lease for lease in self._fleet.leases if lease.engine_serial == engine_serial or (on and lease.tail == on)
        ]
        terms = {lease.terms for lease in leases}
        return Receiver(
            engine_serial=engine_serial,
            engine_type=engine.engine_type,
            module=module,
            rating=aircraft.rating if aircraft else self.least_rating(engine.engine_type),
            ratings=ratings,
            neighbours=tuple(
                (other.module, other.standard)
                for other in self._modules_of.get(engine_serial, ())
                if other.module != module and other.module_serial not in out
            ),
            owner=engine.owner,
            exchange_rule=leases[0].exchange_rule if leases else "",
            asks_for_trace=any(
                row.terms in terms and row.condition == "papers" and row.engine_type == engine.engine_type
                for row in self._fleet.lease_terms
            ),
            tail=on,
            aircraft_type=aircraft.engine_type if aircraft else "",
            leaves_day=aircraft.exit_day if aircraft else None,
            etops_minutes=aircraft.etops_minutes if aircraft else 0,
            worked_on_beside=worked_on_beside,
        )

    def least_rating(self, engine_type: str) -> str:
        """Return the rating of a type with the highest thrust, at which limits are lowest; used off a tail."""
        ratings = [row for row in self._fleet.ratings if row.engine_type == engine_type]
        return max(ratings, key=lambda row: (row.thrust_kN, row.rating)).rating if ratings else ""

    def _module(self, serial: str) -> Module:
        if serial not in self._modules:
            raise RequestError("module", serial, "a module of the fleet")
        return self._modules[serial]

    def _rule_of(self, engine_serial: str) -> str:
        """Return the exchange rule of the lease that an engine is under, through its tail or by itself."""
        engine = self._engines.get(engine_serial)
        for lease in self._fleet.leases:
            if engine is not None and (
                lease.engine_serial == engine_serial or (engine.tail and lease.tail == engine.tail)
            ):
                return lease.exchange_rule
        return ""

    def _part(self, part: Part, rating: str, day: float) -> FitPart:
        number = self._numbers[part.part_number]
        rows = life.rows_for(part.part_serial, tuple(self._limits.get(part.part_number, ())))
        held = life.in_force(rows, rating, day)
        left = life.cycles_left(part.flown, rating, rows, rule=number.counting_rule, day=day, known=part.life_known)
        if (
            held is not None
            and held.limit_hours is not None
            and (math.inf if part.hours_since_new is None else part.hours_since_new) >= held.limit_hours
        ):
            left = 0
        if (
            held is not None
            and held.limit_days is not None
            and day - (-math.inf if part.made_day is None else part.made_day) >= held.limit_days
        ):
            left = 0
        return FitPart(
            serial=part.part_serial,
            part_number=part.part_number,
            belongs_to=(number.engine_type, number.module),
            limit_cycles=None if held is None else held.limit_cycles,
            cycles_left=left,
            known=part.life_known,
            trace_to_birth=part.trace_to_birth,
        )


def _grouped(pairs: Iterable[tuple[str, Item]]) -> dict[str, list[Item]]:
    groups: dict[str, list[Item]] = {}
    for key, item in pairs:
        groups.setdefault(key, []).append(item)
    return groups
