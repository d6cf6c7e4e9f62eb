"""What to do while an engine is open: which parts now, which later, which level, which build goal.

``build(fleet, engine_serial)`` solves the plan of one engine to its end exactly on its points, and plays the simple
rules on the same points and prices. planner/build_rows.py tells the answer as tables.
"""

from __future__ import annotations

import dataclasses
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from planner.build_engine import Planned, problem_for
from planner.build_kernel import Opened, open_at_best
from planner.build_points import openings_of, points_of, used_serials
from planner.build_rules import Played, Rule, best_goal, play
from planner.off_wing import Coming
from planner.openings import Install, Openings, opened_for, plan_usd
from sim.errors import NoSolutionError
from sim.fleet import Fleet
from sim.removal import FAR

POINTS = 26  # even steps from now to the end; more are slower and change the first opening little
RULES: tuple[tuple[str, Rule], ...] = (
    ("hard goal", "hard_goal"),
    ("exposed only", "exposed_only"),
    ("run out", "run_out"),
)


class RuleCost(NamedTuple):
    """A simple rule with its best goal: what it costs, and its plan (None: the rule finds no way to the end)."""

    rule: str
    goal_cycles: int | None
    cost_usd: float | None
    played: Played | None


class BuildPlan(NamedTuple):
    """The best plan of one engine on its points, and what the rules cost on the same points."""

    planned: Planned
    points: tuple[float, ...]
    openings: Openings
    best: Opened
    rules: tuple[RuleCost, ...]
    warnings: tuple[str, ...]

    @property
    def visits(self) -> tuple[int, ...]:
        """Return the points at which the engine is opened."""
        return tuple(np.flatnonzero(visited(self.openings, self.best.restored, self.best.installs)).tolist())

    @property
    def build_goal_cycles(self) -> int | None:
        """Return the cycles from the first opening to the next planned one, or to the end; None without an opening."""
        if not self.visits:
            return None
        after = self.visits[1] if len(self.visits) > 1 else len(self.points) - 1
        return round(self.points[after] - self.points[self.visits[0]])

    @property
    def cost_usd(self) -> float:
        return plan_usd(self.openings, restored=self.best.restored, installs=self.best.installs)

    @property
    def usd_per_cycle(self) -> float:
        return self.cost_usd / self.planned.problem.end_cycles

    @property
    def used(self) -> tuple[str, ...]:
        return used_serials(self.planned.problem)


def build(fleet: Fleet, engine_serial: str, *, open_now: bool | None = None, limit_s: float = 60.0) -> BuildPlan:
    """Return the best plan for one engine. ``open_now`` None: open when it has come off and waits for its visit.

    Raises RequestError for an engine that is unknown or in work, NoSolutionError when nothing keeps limits and margin.
    """
    coming = Coming(fleet)
    view = coming.today
    engine, row = view.engine(engine_serial), view.engine_rows[engine_serial]
    tail = coming.tail_of(engine_serial)
    removal = coming.removal(engine_serial)
    opened = row.place == "shop" if open_now is None else open_now
    slot = removal.slot if removal.cycles < FAR else -1
    planned = problem_for(view, engine, tail, open_now=opened, slot=slot)
    warnings = list(fleet.assumptions)
    if row.place == "shop":
        warnings.append(f"{engine_serial} is planned for {tail}, since it hangs on no tail")
    step = planned.problem.end_cycles / POINTS
    points = points_of(planned.problem, step_cycles=step)
    openings = openings_of(planned.problem, points=points)
    warnings.append(
        f"the engine may be opened at its present limits and every {step:,.0f} cycles; a later life is counted down to "
        "the point before it"
    )
    best = _solved(planned, openings, limit_s, warnings)
    return BuildPlan(planned, points, openings, best, _rules(openings, points), tuple(warnings))


def _solved(planned: Planned, openings: Openings, limit_s: float, warnings: list[str]) -> Opened:
    """Return the best plan; where only the return's own margin cannot be had, without it and with a warning."""
    try:
        return open_at_best(openings, limit_s=limit_s)
    except NoSolutionError:
        budget = openings.budget_degC.copy()
        budget[-1] = planned.problem.budget_degC(planned.problem.end_cycles)
        if budget[-1] <= openings.budget_degC[-1]:
            raise
        warnings.append("the margin that the lease asks for at its return cannot be reached; the plan goes without it")
        return open_at_best(dataclasses.replace(openings, budget_degC=budget), limit_s=limit_s)


def _rules(openings: Openings, points: tuple[float, ...]) -> tuple[RuleCost, ...]:
    goals = tuple(range(1, len(points), max(1, len(points) // 16)))
    step = points[-1] / (len(points) - 1)
    found = []
    for name, rule in RULES:
        try:
            goal, played = (
                best_goal(openings, rule, goals_steps=goals) if rule != "run_out" else (1, play(openings, rule))
            )
        except NoSolutionError:
            found.append(RuleCost(name, None, None, None))
            continue
        cycles = None if rule == "run_out" else round(goal * step)
        found.append(RuleCost(name, cycles, played.cost_usd, played))
    return tuple(found)


def visited(openings: Openings, restored: NDArray[np.bool_], installs: tuple[Install, ...]) -> NDArray[np.bool_]:
    """Return the points at which anything is open."""
    at_all: NDArray[np.bool_] = np.logical_or.reduce(opened_for(openings, restored=restored, installs=installs), axis=0)
    at_all[0] |= openings.must_visit
    return at_all
