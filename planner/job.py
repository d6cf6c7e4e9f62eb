"""One job of a study: simulate a run, price it, keep the figures. numpy only; pandas starts at the rim."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from planner.ledger import Floats, Ledger
from planner.reserves import Reserves
from sim.events import KIND, Log
from sim.fleet import Fleet
from sim.pricing import LINES
from sim.removal import CAUSES
from sim.spec import Setup, setup
from sim.start import Names, names
from sim.world import simulate

REASONS = ("no engine", "engine change", "exchange on the wing")
_REMOVAL, _DOWN, _FLOWN, _PART_OFF, _SHORTAGE, _LEASE, _ON = (
    KIND[k] for k in ("removal", "down", "flown", "part_off", "shortage", "lease_start", "module_on")
)


@dataclass(frozen=True, slots=True, kw_only=True)
class Scenario:
    """What a run needs: the fleet, how long, the seed, and further horizons to value."""

    fleet: Fleet
    horizon_days: float
    seed: int
    sweep_days: tuple[float, ...] = ()


class RunRow(NamedTuple):
    """The figures of one run of one strategy.

    ``costs``: present USD, shape (years, engine types, lines of sim.pricing.LINES). ``sweep``: (horizons, 2): total on
    the consumption basis and cash. ``removals``: (engine types, causes). ``days_lost``: by REASONS. Hours and cycles
    are engine hours and engine cycles flown.
    """

    total_usd: float
    cash_usd: float
    costs: Floats
    sweep: Floats
    hours: float
    cycles: float
    planned_hours: float
    days_lost: Floats
    removals: Floats
    on_wing_hours: float
    stub_cycles: float
    parts_replaced: float
    shortages: float
    leased_in: float
    exchanges: float
    fuel_kg: float
    co2_kg: float


class Prepared(NamedTuple):
    """A scenario under one strategy, ready to run."""

    setup: Setup
    known: Names
    ledger: Ledger
    reserves: Reserves
    planned_hours: float


_prepared: dict[tuple[int, str], tuple[Scenario, Prepared]] = {}


def prepare(scenario: Scenario, strategy: str) -> Prepared:
    """Return the run-ready form, remembered for as long as the worker meets the same scenario object."""
    found = _prepared.get((id(scenario), strategy))
    if found is not None and found[0] is scenario:
        return found[1]
    if len(_prepared) > 32:
        _prepared.clear()
    ready = setup(scenario.fleet, strategy, horizon_days=scenario.horizon_days, sweep_days=scenario.sweep_days)
    prepared = Prepared(ready, names(ready), Ledger(ready), Reserves(ready), planned_hours(ready))
    _prepared[id(scenario), strategy] = (scenario, prepared)
    return prepared


def planned_hours(ready: Setup) -> float:
    """Return the engine hours that the fleet plans to fly over the horizon."""
    total, season, end = 0.0, ready.season, ready.horizon_days
    returns = {lease.tail: lease.return_day for lease in ready.fleet.leases if lease.after_return == "leave"}
    for row in ready.fleet.aircraft:
        last = min(end, row.exit_day if row.exit_day is not None else end, returns.get(row.tail, end))
        changes = sorted(
            (use.from_day, use.hours_per_year)
            for use in ready.fleet.utilisation
            if use.tail in (row.tail, row.sub_fleet)
        )
        since, rate = max(0.0, row.entry_day or 0.0), row.hours_per_year
        for day, after in [*changes, (last, 0.0)]:
            until = min(max(day, since), last)
            total += rate * row.positions * max(0.0, season.flown(until) - season.flown(since))
            since, rate = max(since, until), after
    return total


def run_log(scenario: Scenario, strategy: str, run: int) -> Log:
    """Return the events of one run: a run is a pure function and is repeated when somebody opens it."""
    ready = prepare(scenario, strategy)
    return simulate(ready.setup, ready.known, seed=scenario.seed, run=run)


def run_job(scenario: Scenario, strategy: str, run: int) -> RunRow:
    """Simulate one run of one strategy and return its figures."""
    ready = prepare(scenario, strategy)
    return summarise(ready, simulate(ready.setup, ready.known, seed=scenario.seed, run=run))


def summarise(ready: Prepared, log: Log) -> RunRow:
    """Return the figures of a log."""
    columns = ready.ledger.columns(log)
    ready.ledger.refresh()
    end = ready.setup.horizon_days
    reserve = ready.reserves.priced(log, ready.ledger, end)
    priced = ready.ledger.price_columns(columns, end)
    costs = priced.costs + reserve.costs
    sweep = [(priced.total + reserve.total, priced.cash + reserve.cash)]
    for day in ready.setup.sweep_days:
        part, held = ready.ledger.price_columns(columns, day), ready.reserves.priced(log, ready.ledger, day)
        sweep.append((part.total + held.total, part.cash + held.cash))
    facts = _facts(ready.setup, log)
    return RunRow(
        total_usd=sweep[0][0],
        cash_usd=sweep[0][1],
        costs=costs,
        sweep=np.array([*sweep[1:], sweep[0]]),
        planned_hours=ready.planned_hours,
        **facts,
    )


def _facts(ready: Setup, log: Log) -> dict[str, Any]:
    rows = log.rows
    kinds = {name: i for i, name in enumerate(ready.types)}
    engine_kind = {e.engine_serial: kinds[e.engine_type] for e in ready.fleet.engines}
    aircraft_kind = {a.tail: kinds[a.engine_type] for a in ready.fleet.aircraft}
    removals = np.zeros((len(kinds), len(CAUSES)))
    lost = np.zeros(len(REASONS))
    hours = cycles = on_wing = fuel = stub = replaced = shortages = leased = exchanges = 0.0
    fuel_items = {ready.catalogue.number("fuel", name) for name in kinds}
    ended = 0
    for row in rows:
        kind = row[0]
        if kind == _FLOWN:
            hours += row[10]
            cycles += row[9]
            if row[4] in fuel_items:
                fuel += row[5]
        elif kind == _DOWN:
            lost[REASONS.index(row[8])] += row[5]
        elif kind == _REMOVAL:
            cause = row[8].split(" ", 1)[0]
            removals[engine_kind.get(row[6], aircraft_kind.get(row[7], 0)), CAUSES.index(cause)] += 1.0
            on_wing += row[10]
            ended += 1
        elif kind == _PART_OFF:
            stub += row[10]
            replaced += 1.0
        elif kind == _SHORTAGE:
            shortages += row[8] == "begin"
        elif kind == _LEASE:
            leased += 1.0
        elif kind == _ON:
            exchanges += 1.0
    return {
        "hours": hours,
        "cycles": cycles,
        "days_lost": lost,
        "removals": removals,
        "on_wing_hours": on_wing / ended if ended else 0.0,
        "stub_cycles": stub / replaced if replaced else 0.0,
        "parts_replaced": replaced,
        "shortages": shortages,
        "leased_in": leased,
        "exchanges": exchanges,
        "fuel_kg": fuel,
        "co2_kg": fuel * ready.fleet.settings.co2_kg_per_kg_fuel,
    }


def costs_by_line(row: RunRow) -> NDArray[np.float64]:
    """Return present USD by line, summed over years and types."""
    result: NDArray[np.float64] = row.costs.sum(axis=(0, 1))
    assert len(result) == len(LINES)
    return result
