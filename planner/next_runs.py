"""What follows a removal, as expected: how long the engine is away by each way out, and the law of its next run.

A whole engine is away for two transports, the wait for a slot, and the visit's mean turn time. The wait is that
of slots on a regular grid (sim/queues.py) or of bays; where more work comes than the slots take, the queue grows
and the mean over the horizon is taken of what a fluid would wait. An exchange near the wing takes call-out and
exchange; one in a shop takes a module-exchange visit; one on the wing takes no engine away.
"""

from __future__ import annotations

import math
from typing import NamedTuple

from planner.after_work import after_visit
from planner.causes_ahead import Ahead, ahead
from planner.picture import Picture, flown_to
from sim.queues import erlang_loss, slot_wait_days
from sim.removal import Removal
from sim.spec import NONE, RESTORATION, ShopSpec, TypeSpec
from sim.state import EngineState
from sim.view import Scope
from sim.workscope import scope_of

DAYS_PER_MONTH = 365.25 / 12.0
_DECADE_DAYS = 3652.5


class Run(NamedTuple):
    """One engine's next removal and what follows: the visit's kind, and what will take the engine off after it."""

    visit: str
    after: Ahead


class ShopLoad(NamedTuple):
    """A type's shops against its work: slots a month that exist (inf: no bound), and the mean wait for one in
    days."""

    slots_per_month: float
    wait_days: float
    load_frac: float


def next_run(view: Picture, one: Ahead, *, exchanged: bool) -> Run | None:
    """Return the visit that the first planned cause asks for, and the run after it; None without such a cause.

    ``exchanged``: the module that limits is exchanged for a restored one; else the engine goes whole, built for
    the goal.
    """
    first = next((p for p in one.planned if p.cause not in ("lease_end", "return", "exit")), None)
    if first is None or not view.engines[one.engine_serial].modules:
        return None
    flown = flown_to(view, view.engines[one.engine_serial], one.tail, cycles=int(first.cycles))
    rating = view.tails[one.tail].flying.rating
    if exchanged:
        scope = _exchanged_scope(view, flown, one.tail, slot=first.slot)
    else:
        scope = expected_scope(view, flown, one.tail, cause=first.cause, slot=first.slot)
    twin = after_visit(view, flown, scope, rating=rating, day=first.day)
    for module in twin.modules:
        module.csb, module.hsb = 0, 0.0
    return Run(scope.visit, ahead(view, twin, one.tail, dated=False))


def _exchanged_scope(view: Picture, engine: EngineState, tail: str, *, slot: int) -> Scope:
    """Return an exchange as work on the engine: the module comes back restored, its parts good for the build goal.

    Without margin the module that has lost most is exchanged (a second one at the same time is seldom on the shelf).
    """
    rating = view.tails[tail].flying.rating
    worst = min(engine.modules, key=lambda m: (-m.lost_degC(rating), m.spec.slot)).spec.slot
    slots = {slot if slot >= 0 else worst}
    goal = view.strategy(engine.spec.engine_type).build_goal_cycles
    levels = tuple(RESTORATION if m.spec.slot in slots else NONE for m in engine.modules)
    replace = tuple(
        tuple(
            i
            for i, part in enumerate(m.parts)
            if part.left(m.run, rating, part.epochs[-1]) < min(goal, part.epochs[-1].limits[rating])
        )
        if m.spec.slot in slots
        else ()
        for m in engine.modules
    )
    return Scope("module_exchange", levels, replace)


def expected_scope(view: Picture, engine: EngineState, tail: str, *, cause: str, slot: int) -> Scope:
    """Return the work on an engine (in its state of that day) that comes off a tail for a cause."""
    aircraft = view.tails[tail]
    seen = view.world.matching.view(aircraft, engine, Removal(0, cause, slot))
    strategy = view.strategy(engine.spec.engine_type)
    return scope_of(
        seen,
        goal_cycles=strategy.build_goal_cycles,
        stub_cycles=strategy.stub_cycles,
        only_cause=False,
        catalogue=view.setup.catalogue,
    )


def visit_days(shops: tuple[ShopSpec, ...], visit: str) -> float:
    """Return the mean turn time of a visit with both transports, averaged over the shops by their slots."""
    weights = [_per_month(shop) for shop in shops]
    if not shops:
        return 0.0
    if math.inf in weights:
        weights = [1.0 if weight == math.inf else 0.0 for weight in weights]
    days = []
    for shop in shops:
        law = shop.turn.get(visit) or shop.turn[next(iter(shop.turn))]
        days.append(law.mean_days + 2.0 * shop.transport_days)
    return sum(d * w for d, w in zip(days, weights, strict=True)) / sum(weights)


def _per_month(shop: ShopSpec) -> float:
    if shop.bays is not None:
        mean = sum(law.mean_days for law in shop.turn.values()) / max(1, len(shop.turn))
        return shop.bays * DAYS_PER_MONTH / mean
    return math.inf if shop.per_month is None else shop.per_month


def shop_load(shops: tuple[ShopSpec, ...], per_month: float, *, horizon_days: float, spread: float = 1.0) -> ShopLoad:
    """Return how a type's engine shops bear so many inductions a month.

    ``spread``: variance over mean of inductions in a long time.
    """
    slots = sum(_per_month(shop) for shop in shops)
    if not shops or slots == math.inf:
        return ShopLoad(math.inf, 0.0, 0.0)
    load = per_month / slots
    if all(shop.bays is not None for shop in shops):
        return ShopLoad(slots, _bay_wait(shops, per_month), load)
    interval = DAYS_PER_MONTH / slots
    wait = slot_wait_days(per_day=per_month / DAYS_PER_MONTH, interval_days=interval, spread=spread)
    # a queue near or beyond saturation has not reached its long-run length within the horizon
    return ShopLoad(slots, min(wait, interval / 2.0 + _fluid_wait(load, interval, horizon_days, spread)), load)


def _fluid_wait(load: float, interval: float, horizon_days: float, spread: float = 1.0) -> float:
    """Return the mean wait over the horizon of a queue that starts empty: its drift, and its random walk.

    A reflected random walk without drift stands at ``sqrt(2 variance t / pi)`` on average (Harrison, *Brownian
    Motion and Stochastic Flow Systems*, 1985, ch. 1; from memory); the mean over the horizon is two thirds of its
    end.
    """
    drift = max(0.0, load - 1.0) * horizon_days / 2.0
    return drift + math.sqrt(spread * load * interval * horizon_days) * 2.0 / 3.0 * math.sqrt(2.0 / math.pi)


def _bay_wait(shops: tuple[ShopSpec, ...], per_month: float) -> float:
    """Return the mean wait for one of the bays together (M/M/c, long run, cut off at a year)."""
    bays = sum(shop.bays or 0 for shop in shops)
    laws = [law.mean_days for shop in shops for law in shop.turn.values()]
    stay = sum(laws) / max(1, len(laws))
    offered = per_month / DAYS_PER_MONTH * stay
    if bays == 0 or offered >= bays:
        return 365.25
    lost = erlang_loss(bays, offered)
    waits = lost / (1.0 - offered / bays * (1.0 - lost))
    return min(365.25, waits * stay / (bays - offered))


def exchange_days(view: Picture, kind: TypeSpec, slot: int, shops: tuple[ShopSpec, ...], *, wait_days: float) -> float:
    """Return the days for which an engine is away when its module is exchanged from the shelf; 0 on the wing."""
    module = kind.modules[slot]
    if module.place == "wing":
        return 0.0
    if module.place == "near_wing":
        return call_out_days(view, kind.engine_type) + module.exchange_days
    return wait_days + visit_days(shops, "module_exchange")


def module_back_days(view: Picture, kind: TypeSpec, slot: int, *, per_month: float) -> float:
    """Return the days until a module that came off is on the shelf again: ways, wait for a slot, mean repair.

    ``per_month``: modules of the type that come off in a month, which share the shops' module slots.
    """
    shops = view.setup.shops[kind.engine_type]
    repair = kind.modules[slot].repair.mean_days
    if not shops:
        return repair
    ways = sum(2.0 * shop.transport_days for shop in shops) / len(shops)
    if any(shop.module_bays is not None or shop.modules_per_month is None for shop in shops):
        return repair + ways
    interval = DAYS_PER_MONTH / sum(shop.modules_per_month or 0.0 for shop in shops)
    wait = slot_wait_days(per_day=per_month / DAYS_PER_MONTH, interval_days=interval)
    grown = interval / 2.0 + _fluid_wait(per_month * interval / DAYS_PER_MONTH, interval, _DECADE_DAYS)
    return repair + ways + min(wait, grown)


def call_out_days(view: Picture, kind: str) -> float:
    """Return the least call-out of the teams that work on a type; 0 without teams."""
    return min((t.call_out_days for t in view.setup.teams if not t.engine_types or kind in t.engine_types), default=0.0)
