"""The lease returns of a fleet: conditions at return, money, the cheapest cure of all returns together, what goes home.

``lease_returns(fleet, …)`` simulates the fleet to the last return, looks at the engines that go back on the day before,
costs every way through for each of them on the same runs, and chooses for all returns at once, so that one good engine
or module is not promised twice.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import NamedTuple

import numpy as np

from planner.assignment import Choices, Chosen, choose
from planner.lease_cures import Cure, extend, fly_out, swap_engine, swap_module, visit_before
from planner.lease_outcome import Outcome, outcome
from planner.lease_runs import Returned, own_engines, returns_by_run
from planner.picture import DAYS_PER_YEAR, Picture, flown_to, foreseen, picture
from sim.errors import RequestError
from sim.fleet import Engine, Fleet, Lease

RUNS = 60  # percentiles from forty runs on; sixty hold a chance of passing to some six points
_MOST_ENGINES, _MOST_MODULES = 5, 4  # candidates looked at for each engine that goes back

Fits = Callable[[str, str, str], str]  # module, engine, tail -> why it may not go on, or an empty string


class ReturnOf(NamedTuple):
    """One engine that goes back with a lease: its outcomes by run, and every cure costed."""

    lease: Lease
    engine: Engine
    runs: tuple[Returned, ...]
    outcomes: tuple[Outcome, ...]
    cures: tuple[Cure, ...]

    @property
    def pass_chance(self) -> float:
        return sum(one.passes for one in self.outcomes) / max(1, len(self.outcomes))


class LeaseAnswer(NamedTuple):
    """All returns asked for, the number of the cure chosen for each, the cost and its bound, and what was assumed."""

    view: Picture
    returns: tuple[ReturnOf, ...]
    chosen: tuple[int, ...]
    cost_usd: float
    bound_usd: float
    runs: int
    seed: int
    warnings: tuple[str, ...]


def lease_returns(
    fleet: Fleet, *, lease: str | None = None, runs: int = RUNS, seed: int = 1, fits: Fits = lambda *_: ""
) -> LeaseAnswer:
    """Return the answer for one lease, or for all whose return lies inside the horizon.

    Raises RequestError for a lease that is not in the records, or for fewer than one run.
    """
    if runs < 1:
        raise RequestError("runs", str(runs), "at least 1")
    view = picture(fleet)
    leases = _asked(fleet, lease)
    with_engines = tuple(one for one in leases if own_engines(fleet, one))
    warnings = [
        f"lease {one.lease} has no engine that hangs on its tail and belongs to its owner"
        for one in leases
        if one not in with_engines
    ]
    others = {one.lease: _candidates(view, one) for one in with_engines}
    by_run = returns_by_run(view, with_engines, others=others, runs=runs, seed=seed)
    returns = []
    for one in with_engines:
        for row in own_engines(fleet, one):
            if all(row.engine_serial in run.engines for run in by_run[one.lease]):
                returns.append(_return_of(view, one, row, by_run[one.lease], others[one.lease], fits))
            else:
                warnings.append(f"{row.engine_serial} has left the fleet before the return of {one.lease} in some run")
    if runs < 40:
        warnings.append(f"{runs} runs are too few for percentiles (40 at least)")
    chosen, cost, bound = _choose(returns)
    return LeaseAnswer(view, tuple(returns), chosen, cost, bound, runs, seed, tuple(warnings))


def _asked(fleet: Fleet, name: str | None) -> tuple[Lease, ...]:
    if name is None:
        horizon = fleet.settings.horizon_years * DAYS_PER_YEAR
        return tuple(one for one in fleet.leases if one.return_day <= horizon)
    found = tuple(one for one in fleet.leases if one.lease == name)
    if not found:
        known = ", ".join(one.lease for one in fleet.leases) or "none"
        raise RequestError("lease", name, f"a lease of the records ({known})")
    return found


def _return_of(
    view: Picture,
    lease: Lease,
    row: Engine,
    runs: tuple[Returned, ...],
    others: tuple[tuple[str, ...], tuple[str, ...]],
    fits: Fits,
) -> ReturnOf:
    away = _away(view, lease, row)
    outcomes = tuple(outcome(view, lease, one.engines[row.engine_serial], rating=one.rating, away=away) for one in runs)
    base = fly_out(view, lease, row, runs, away)
    cures = [
        base,
        visit_before(view, lease, row, runs, away, parts_only=True),
        visit_before(view, lease, row, runs, away, parts_only=False),
        extend(view, lease, row, base),
    ]
    if base.pass_chance < 1.0:
        cures += [swap_engine(view, lease, row, runs, other=serial, away=away) for serial in others[0]]
        for serial in others[1]:
            slot = view.modules[serial].spec.slot
            cures.append(swap_module(view, lease, row, runs, other=serial, slot=slot, away=away, fits=fits))
    return ReturnOf(lease, row, runs, outcomes, tuple(cures))


def _away(view: Picture, lease: Lease, row: Engine) -> tuple[str, ...]:
    """Return the serials of the lease's owner that were delivered in an engine and are in another now."""
    inside = {m.module_serial for m in view.fleet.modules if m.engine_serial == row.engine_serial}
    delivered = {d.serial for d in view.fleet.lease_delivery if d.lease == lease.lease}
    of_engine = {m.module_serial: m.engine_serial for m in view.fleet.modules}
    strangers = sorted(
        m.module_serial
        for m in view.fleet.modules
        if m.engine_serial == row.engine_serial and lease.owner and m.owner and m.owner != lease.owner
    )
    gone = sorted(serial for serial in delivered & set(of_engine) if serial not in inside and len(delivered) < 8)
    return tuple(dict.fromkeys((*strangers, *gone)))


def _candidates(view: Picture, lease: Lease) -> tuple[tuple[str, ...], tuple[str, ...]]:
    """Return engines and pool modules that might go back in place of own ones: those that would pass, the cheapest
    first by life that they hold, then the others."""
    own = own_engines(view.fleet, lease)
    kind, serials = own[0].engine_type, {e.engine_serial for e in own}
    lessors = {one.owner for one in view.fleet.leases}
    scored = []
    for row in view.fleet.engines:
        ours = row.owner not in lessors or row.owner == lease.owner
        if row.engine_type != kind or row.engine_serial in serials or not ours or row.place == "leased_in":
            continue
        scored.append((_misses(view, lease, row), row.engine_serial))
    engines = tuple(serial for _, serial in sorted(scored)[:_MOST_ENGINES])
    modules = tuple(
        m.module_serial
        for m in sorted(view.fleet.modules, key=lambda m: (m.cycles_since_restoration, m.module_serial))
        if m.engine_type == kind and not m.engine_serial
    )
    return engines, modules[:_MOST_MODULES]


def _misses(view: Picture, lease: Lease, row: Engine) -> tuple[bool, float]:
    """Return whether an engine would miss a condition if it flew to the return as planned, and what its parts hold."""
    engine = view.engines[row.engine_serial]
    tail = row.tail or lease.tail or next(a.tail for a in view.fleet.aircraft if a.engine_type == row.engine_type)
    flown = 0
    if row.tail:
        flown = min(view.uses[tail].whole_cycles(max(0.0, lease.return_day)), foreseen(view, engine, tail).cycles)
    later = flown_to(view, engine, tail, cycles=flown)
    rating = view.tails[tail].flying.rating
    found = outcome(view, lease, later, rating=rating)
    held = sum(p.fraction_left(m.run, rating, 0.0) * p.spec.price_usd for m in later.modules for p in m.parts)
    return not found.passes, held


def _choose(returns: Sequence[ReturnOf]) -> tuple[tuple[int, ...], float, float]:
    """Return the cure chosen for each return, with every serial used at most once; the cost and what was proven."""
    options = [(d, c) for d, one in enumerate(returns) for c, cure in enumerate(one.cures) if cure.allowed]
    if not options:
        return (), 0.0, 0.0
    serials = sorted({s for d, c in options for s in returns[d].cures[c].uses})
    uses = tuple(
        (o, serials.index(serial), 1) for o, (d, c) in enumerate(options) for serial in returns[d].cures[c].uses
    )
    problem = Choices(
        demands=len(returns),
        demand=np.array([d for d, _ in options], dtype=np.int64),
        cost_usd=np.array([returns[d].cures[c].cost_usd for d, c in options]),
        capacity=np.ones(len(serials), dtype=np.int64),
        uses=uses,
    )
    found = choose(problem)
    assert isinstance(found, Chosen)  # flying out needs nothing and is always allowed
    return tuple(options[o][1] for o in found.options.tolist()), found.cost_usd, found.bound_usd
