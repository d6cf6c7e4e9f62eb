"""What goes back at each lease's return, run by run: the simulation itself, stopped to look on the day before.

Nothing is changed by looking: what was flown is booked, the lease's own engines and those that could take their place
are copied, and the run goes on. Own engines are those of the owner that hang on the tail on the as-of date.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import NamedTuple

from planner.picture import Picture, cloned, cloned_module
from sim import start
from sim.fleet import Engine, Fleet, Lease
from sim.setting_out import set_out
from sim.spec import Setup, setup
from sim.state import EngineState, ModuleState
from sim.world import World

_BEFORE_DAYS = 1e-3  # the look comes this long before the return settles


class Returned(NamedTuple):
    """One run's state just before a return: engines and modules by serial, and the rating number of the tail.

    ``where`` gives the tail on which an engine hangs then, blank when it is on none.
    """

    run: int
    rating: int
    engines: Mapping[str, EngineState]
    modules: Mapping[str, ModuleState]
    where: Mapping[str, str]


def own_engines(fleet: Fleet, lease: Lease) -> tuple[Engine, ...]:
    """Return the engines that go back with a lease, by position."""
    if lease.engine_serial:
        return tuple(e for e in fleet.engines if e.engine_serial == lease.engine_serial)
    on_tail = [e for e in fleet.engines if e.tail == lease.tail and lease.tail]
    elsewhere = [e for e in fleet.engines if e not in on_tail and e.engine_serial in _delivered(fleet, lease)]
    ours = [e for e in on_tail if e.owner in ("", lease.owner)]
    return tuple(sorted((*ours, *elsewhere), key=lambda e: (e.position or 9, e.engine_serial)))


def _delivered(fleet: Fleet, lease: Lease) -> set[str]:
    return {row.serial for row in fleet.lease_delivery if row.lease == lease.lease}


def returns_by_run(
    view: Picture,
    leases: tuple[Lease, ...],
    *,
    others: Mapping[str, tuple[tuple[str, ...], tuple[str, ...]]],
    runs: int,
    seed: int,
) -> dict[str, tuple[Returned, ...]]:
    """Return the states at each lease's return in every run.

    ``others`` names, by lease, further engines and modules to copy. Leases that are already due are taken as they are.
    """
    if not leases:
        return {}
    last = max(lease.return_day for lease in leases)
    strategy = next(iter(view.setup.strategy.values())).strategy
    ready = setup(view.fleet, strategy, horizon_days=max(last, 1.0) + 1.0)
    known = start.names(ready)
    found: dict[str, list[Returned]] = {lease.lease: [] for lease in leases}
    for run in range(runs):
        world = World(ready, known, seed=seed, run=run)
        set_out(world)
        for process in world.aircraft:
            world.env.process(process.life())
        for lease in sorted(leases, key=lambda one: (one.return_day, one.lease)):
            day = lease.return_day - _BEFORE_DAYS
            if day > world.env.now:
                world.env.run(until=day)
            found[lease.lease].append(_looked(world, ready, lease, others.get(lease.lease, ((), ())), run=run))
    return {name: tuple(rows) for name, rows in found.items()}


def _looked(
    world: World, ready: Setup, lease: Lease, others: tuple[tuple[str, ...], tuple[str, ...]], *, run: int
) -> Returned:
    for flown in world.aircraft:
        flown.book_now()
    wanted = {e.engine_serial for e in own_engines(ready.fleet, lease)} | set(others[0])
    for serial in wanted:
        if serial in world.under_way and world.under_way[serial][0] <= world.env.now:
            world.under_way[serial][1]()  # work that has begun counts as done, as the valuation has it
    engines = {e.serial: cloned(e) for e in world.all_engines if e.serial in wanted and e.serial not in world.gone}
    modules = {m.serial: cloned_module(m) for m in world.all_modules if m.serial in set(others[1])}
    where = {e.serial: a.row.tail for a in world.aircraft for e in a.engines if e is not None}
    process = next((a for a in world.aircraft if a.row.tail == lease.tail), None)
    kind = next(e.engine_type for e in ready.fleet.engines if e.engine_serial in wanted) if wanted else ""
    rating = process.flying.rating if process is not None else world.matching.default_rating(kind)
    return Returned(run, rating, engines, modules, where)
