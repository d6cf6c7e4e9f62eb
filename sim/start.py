"""The fleet as it is on the as-of date, as the states that a run changes.

Wear is solved from the measured loss (``margin_lost_degC``), hazard budgets are conditional on the age reached, limits
are those of the serial. Draws belong to serials, so the same run number gives the same luck under every strategy.
"""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np

from sim import life
from sim.draws import Luck, entity, normal
from sim.fleet import Engine, Fleet, Module, Part, PartLimit
from sim.spec import Setup
from sim.state import EngineState, Epoch, ModuleState, PartState, early_cycle, epoch
from sim.wear import gained

MODULE_PURPOSES = ("wear", "unscheduled", "distress", "early", "repair", "findings")
ENGINE_PURPOSES = ("turn", "margin")


class Names(NamedTuple):
    """The entities of a fleet, for drawing all at once."""

    modules: np.ndarray[tuple[int], np.dtype[np.uint64]]
    engines: np.ndarray[tuple[int], np.dtype[np.uint64]]
    tails: np.ndarray[tuple[int], np.dtype[np.uint64]]
    module_index: dict[str, int]
    engine_index: dict[str, int]
    epochs: dict[str, tuple[Epoch, ...]]
    new_epochs: dict[str, tuple[Epoch, ...]]
    parts_by_module: dict[str, tuple[Part, ...]]


def names(setup: Setup) -> Names:
    """Return what every run of a study needs of the fleet and that no run changes."""
    fleet = setup.fleet
    by_number: dict[str, list[PartLimit]] = {}
    for limit in fleet.part_limits:
        by_number.setdefault(limit.part_number, []).append(limit)
    ratings = {p.part_number: setup.types[p.engine_type].ratings for p in fleet.part_types}
    plain = {n: _epochs(life.rows_for("", tuple(by_number.get(n, ()))), ratings[n]) for n in ratings}
    epochs: dict[str, tuple[Epoch, ...]] = {}
    ranged = {n for n, rows in by_number.items() if any(row.directive for row in rows)}
    parts: dict[str, list[Part]] = {}
    for part in fleet.parts:
        n = part.part_number
        if n in ranged:
            rows = life.rows_for(part.part_serial, tuple(by_number[n]))
            epochs[part.part_serial] = _epochs(rows, ratings[n])
        if part.module_serial:
            parts.setdefault(part.module_serial, []).append(part)
    return Names(
        modules=np.array([entity("module", m.module_serial) for m in fleet.modules], dtype=np.uint64),
        engines=np.array([entity("engine", e.engine_serial) for e in fleet.engines], dtype=np.uint64),
        tails=np.array([entity("lease", a.tail) for a in fleet.aircraft], dtype=np.uint64),
        module_index={m.module_serial: i for i, m in enumerate(fleet.modules)},
        engine_index={e.engine_serial: i for i, e in enumerate(fleet.engines)},
        epochs=epochs,
        new_epochs=plain,
        parts_by_module={serial: tuple(rows) for serial, rows in parts.items()},
    )


def _epochs(rows: tuple[PartLimit, ...], ratings: tuple[str, ...]) -> tuple[Epoch, ...]:
    """Return limits by rating from each day on which one changes; the first epoch holds from before the as-of date."""
    days = (0.0, *(day for day in life.change_days(rows) if day > 0.0))
    result = []
    for day in days:
        held = [life.in_force(rows, rating, day) for rating in ratings]
        found = [row for row in held if row is not None]
        result.append(
            epoch(
                day,
                tuple(row.limit_cycles if row else 0 for row in held),
                limit_hours=min((row.limit_hours for row in found if row.limit_hours), default=math.inf),
                limit_days=min((row.limit_days for row in found if row.limit_days), default=math.inf),
                directive=any(row.directive for row in found),
            )
        )
    return tuple(result)


def luck(known: Names, *, seed: int, run: int) -> tuple[Luck, Luck, Luck]:
    """Return the draws of modules, of engines and of tails (requests for a lease-in) for one run."""
    return (
        Luck(known.modules, MODULE_PURPOSES, seed=seed, run=run),
        Luck(known.engines, ENGINE_PURPOSES, seed=seed, run=run),
        Luck(known.tails, ("lease_in",), seed=seed, run=run),
    )


def part_state(part: Part, setup: Setup, known: Names) -> PartState:
    """Return a part as it is recorded; cycles by rating that the history does not give make its life unknown."""
    spec = setup.parts[part.part_number]
    kind = next(p.engine_type for p in setup.fleet.part_types if p.part_number == part.part_number)
    ratings = setup.types[kind].ratings
    counts = dict.fromkeys(ratings, 0)
    for rating, cycles in part.flown:
        counts[rating] = counts.get(rating, 0) + cycles
    return PartState(
        part.part_serial,
        spec,
        epochs=known.epochs.get(part.part_serial) or known.new_epochs[part.part_number],
        flown=tuple(counts[r] for r in ratings),
        hours=part.hours_since_new or 0.0,
        made_day=part.made_day or 0.0,
        owner=part.owner,
        known=part.life_known,
    )


def module_state(row: Module, setup: Setup, known: Names, draws: Luck) -> ModuleState:
    """Return a module as it is recorded, with its hazards drawn for this run; its wear is set by ``settle_wear``."""
    kind = setup.types[row.engine_type]
    spec = next(m for m in kind.modules if m.module == row.module)
    index = known.module_index[row.module_serial]
    state = ModuleState(
        row.module_serial, spec, index=index, ratings=len(kind.ratings), owner=row.owner, standard=row.standard
    )
    state.csn, state.csr, state.csb = row.cycles_since_new, row.cycles_since_restoration, row.cycles_since_build
    state.hsn, state.hsr, state.hsb = row.hours_since_new, row.hours_since_restoration, row.hours_since_build
    state.first_run = row.first_run
    for part in known.parts_by_module.get(row.module_serial, ()):
        one = part_state(part, setup, known)
        one.mark_hours = state.hsn
        state.parts.append(one)
    state.parts_changed()
    draw_hazards(state, draws)
    state.early_at = early_cycle(spec.early, draws.draw("early", index, 0), state.csb)
    return state


def draw_hazards(state: ModuleState, draws: Luck) -> None:
    """Draw a budget for every chance cause afresh (count of draws 0)."""
    state.draws = [0 for _ in state.hazards()]
    state.budgets = [-math.log(draws.draw(one.cause, state.index, 0)) for one in state.hazards()]


def settle_wear(state: ModuleState, row: Module, *, rating: int, factor: float, hours: float) -> bool:
    """Set loss and the serial's own factor from the measured loss; return whether the factor had to be clipped.

    ``factor``: environment times derate factor of where it flies; ``hours``: hours a cycle there.
    """
    law = state.spec.wear[rating]
    state.permanent = 0.0 if row.first_run else law.unrecoverable
    expected = factor * gained(law, 0.0, state.csr, hours)
    if row.margin_lost_degC is None:
        state.loss = expected
        return False
    total = row.margin_lost_degC / law.unit_degC
    state.permanent = min(state.permanent, max(0.0, total))
    state.loss = total - state.permanent
    if expected <= 1e-9:
        return False
    solved = state.loss / expected
    low, high = max(0.05, 1.0 - 3.0 * state.spec.spread), 1.0 + 3.0 * state.spec.spread
    state.factor = min(high, max(low, solved))
    return abs(state.factor - solved) > 1e-9


def new_factor(state: ModuleState, draws: Luck) -> float:
    """Return the wear factor of a fresh restoration: normal around one, clipped at three spreads."""
    spread = state.spec.spread
    if spread == 0.0:
        return 1.0
    z = max(-3.0, min(3.0, normal(draws.draw("wear", state.index, state.restorations))))
    return max(0.05, 1.0 + spread * z)


def engine_state(row: Engine, setup: Setup, known: Names) -> EngineState:
    """Return an engine's counters; its modules are hung on by the world."""
    state = EngineState(
        row.engine_serial,
        setup.types[row.engine_type],
        index=known.engine_index[row.engine_serial],
        owner=row.owner,
        standard=row.standard,
    )
    state.csn, state.csb, state.hsn = row.cycles_since_new, row.cycles_since_build, row.hours_since_new
    if row.lease_in_until_day is not None:
        state.lease_end = row.lease_in_until_day
    return state


def modules_of(fleet: Fleet) -> dict[str, list[Module]]:
    """Return the modules by the engine that they are built into."""
    found: dict[str, list[Module]] = {}
    for row in fleet.modules:
        if row.engine_serial:
            found.setdefault(row.engine_serial, []).append(row)
    return found
