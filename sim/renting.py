"""Engines leased in: looked for after a set time, perhaps not found, paid by day, hour and cycle, sent back."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING

from sim.events import KIND
from sim.state import EngineState

if TYPE_CHECKING:
    from sim.aircraft import AircraftProcess
    from sim.world import World

_SOUGHT, _START, _END = (KIND[k] for k in ("lease_sought", "lease_start", "lease_end"))
_SUMMER = (6, 7, 8, 9)  # June to September, as lease_market.summer_chance says


def _exchange_rules(world: World) -> dict[str, str]:
    """Return what the lease of each engine and module (by serial) says of exchanges; what is under none is left out."""
    fleet = world.setup.fleet
    of_tail = {lease.tail: lease.exchange_rule for lease in fleet.leases if lease.tail}
    rules = {lease.engine_serial: lease.exchange_rule for lease in fleet.leases if lease.engine_serial}
    for engine in fleet.engines:
        if engine.tail in of_tail:
            rules[engine.engine_serial] = of_tail[engine.tail]
    for module in fleet.modules:
        if module.engine_serial in rules:
            rules[module.module_serial] = rules[module.engine_serial]
    return rules


class Renting:
    """The lease market as one run meets it."""

    __slots__ = ("_since", "exchange_rules", "requests", "world")

    def __init__(self, world: World) -> None:
        self.world = world
        self.requests: dict[str, int] = {}
        self._since: dict[str, tuple[float, EngineState, AircraftProcess | None]] = {}
        self.exchange_rules = _exchange_rules(world)

    def look_out(self, aircraft: AircraftProcess) -> None:
        """An aircraft begins to wait: seek a lease-in after the strategy's set time."""
        after = self.world.setup.strategy[aircraft.row.engine_type].lease_in_after_days
        market = self.world.setup.market.get(aircraft.row.engine_type)
        if after is None or market is None:
            return
        began = aircraft.waiting_since
        self.world.at(self.world.env.now + after, lambda _: self._seek(aircraft, began))

    def _seek(self, aircraft: AircraftProcess, began: float) -> None:
        """Ask the market once for each engine missing; again after some days."""
        if aircraft.waiting_since != began or None not in aircraft.engines:
            return
        world = self.world
        market = world.setup.market[aircraft.row.engine_type]
        now = world.env.now
        summer = world.season.month(now) in _SUMMER and market.summer_chance is not None
        chance = market.summer_chance if summer and market.summer_chance is not None else market.chance
        tail = aircraft.row.tail
        number = self.requests.get(tail, 0)
        self.requests[tail] = number + 1
        uniform = world.tail_luck.draw("lease_in", world.tail_number[tail], number)
        found = uniform < chance
        world.log.fact(_SOUGHT, now, tail, detail="found" if found else "not found")
        if found:
            world.at(now + market.lead_days, lambda _: self._deliver(aircraft, began, number))
        else:
            world.at(now + market.retry_days, lambda _: self._seek(aircraft, began))

    def _deliver(self, aircraft: AircraftProcess, began: float, number: int) -> None:
        if aircraft.waiting_since != began or None not in aircraft.engines:
            return  # an own engine came first; the request lapses at no cost
        world, now = self.world, self.world.env.now
        engine = EngineState(
            f"lease/{aircraft.row.tail}/{number}", aircraft.spec, index=-1, owner="leased in", standard=""
        )
        engine.leased = True
        position = aircraft.engines.index(None)
        kind = aircraft.row.engine_type
        pool = world.engine_pools[kind]
        pool.waiting = [one for one in pool.waiting if not (one[3] is aircraft and one[2] == position)]
        self._since[engine.serial] = (now, engine, aircraft)
        world.log.fact(_START, now, engine.serial, aircraft.row.tail)
        world.log.cost(now, world.item("lease_in", kind, "delivery"), 1.0, engine.serial)
        aircraft.receive(position, engine)
        if None in aircraft.engines:
            self._seek(aircraft, began)
        least = world.setup.market[kind].least_days
        world.at(now + least, lambda _: self._spare_for(kind))

    def _spare_for(self, kind: str) -> None:
        if self.world.engine_pools[kind].engines:
            self.call_back(kind)

    def call_back(self, kind: str) -> bool:
        """Send the rented engine that is longest on hire back if its least term is over; return whether one goes."""
        world, now = self.world, self.world.env.now
        least = world.setup.market[kind].least_days if kind in world.setup.market else math.inf
        for since, engine, aircraft in sorted(self._since.values(), key=lambda one: (one[0], one[1].serial)):
            if engine.spec.engine_type != kind or aircraft is None or now - since < least:
                continue
            if aircraft.flying_since < 0.0 or engine not in aircraft.engines:
                continue
            position = aircraft.engines.index(engine)
            if not any(
                world.matching.fit_value(aircraft, position, spare) < math.inf
                for spare in world.engine_pools[kind].engines
            ):
                continue
            if ("call_back", position) not in aircraft.requests:
                aircraft.ask("call_back", position)
            return True
        return False

    def recorded(self, engine: EngineState) -> None:
        """Note an engine that is already leased in on the as-of date."""
        self._since[engine.serial] = (0.0, engine, None)

    def give_back(self, engine: EngineState) -> None:
        """End a lease-in: pay, and take the engine out of the fleet."""
        world, now = self.world, self.world.env.now
        entry = self._since.pop(engine.serial, None)
        if entry is None:
            return
        self._pay(engine, entry[0], now)
        world.log.fact(_END, now, engine.serial)
        if engine.modules:
            world.gone.append(engine.serial)

    def _pay(self, engine: EngineState, since: float, until: float) -> None:
        world, kind = self.world, engine.spec.engine_type
        market = world.setup.market.get(kind)
        if market is None:
            return
        days = max(until - since, float(market.least_days) if engine.leased else 0.0)
        span = world.log.span
        end = max(until, since + 1e-6)
        span(_END, since, end, world.item("lease_in", kind, "day"), days, engine.serial, "", "rent")
        if engine.leased:
            hours, cycles = engine.hsn, float(engine.csn)
            span(_END, since, end, world.item("lease_in", kind, "hour"), hours, engine.serial, "", "rent by hour")
            span(_END, since, end, world.item("lease_in", kind, "cycle"), cycles, engine.serial, "", "rent by cycle")

    def close(self) -> None:
        """Pay the hire of what is still leased in on the last day."""
        for since, engine, _ in list(self._since.values()):
            self._pay(engine, since, self.world.end_days)
