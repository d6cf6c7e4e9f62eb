"""What to do while an engine is open: which parts now, which later, which level, which build goal.

``build(fleet, engine_serial)`` solves the plan of one engine to its end exactly on its points, and plays the simple
rules at the same prices on finer ones. planner/build_rows.py tells the answer as tables.
"""

from __future__ import annotations

import dataclasses
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from planner.build_engine import Planned, problem_for
from planner.build_kernel import Opened
from planner.build_points import used_serials
from planner.build_rules import Played, Rule, best_goal, play
from planner.build_search import Searched, goals_of, search
from planner.off_wing import Coming
from planner.openings import Install, Openings, opened_for, plan_usd
from sim.errors import NoSolutionError, RequestError
from sim.fleet import Fleet
from sim.removal import FAR

YEARS = 6.0  # span of a plan; beyond it, what is left counts at its worth
LIMIT_S = 5.0
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
    fine_points: tuple[float, ...]
    fine: Openings
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


def build(
    fleet: Fleet,
    engine_serial: str,
    *,
    open_now: bool | None = None,
    years: float = YEARS,
    limit_s: float = LIMIT_S,
) -> BuildPlan:
    """Return the best plan for one engine over some years, or to its lease return or exit when that comes first.

    ``open_now`` None: open when it has come off and waits for its visit.
    Raises RequestError for an engine that is unknown or in work, NoSolutionError when nothing keeps limits and margin.
    """
    if not 0.0 < years <= 40.0:
        raise RequestError("build plan, years", f"{years:g}", "more than 0, at most 40")
    settings = dataclasses.replace(fleet.settings, horizon_years=min(years, fleet.settings.horizon_years))
    coming = Coming(dataclasses.replace(fleet, settings=settings))
    view = coming.today
    engine, row = view.engine(engine_serial), view.engine_rows[engine_serial]
    tail = coming.tail_of(engine_serial)
    if row.place == "shop" and row.inducted_day is not None:
        raise RequestError("engine", engine_serial, "an engine whose work is still open", "its visit has begun")
    removal = coming.removal(engine_serial)
    opened = row.place == "shop" if open_now is None else open_now
    slot = removal.slot if removal.cycles < FAR else -1
    planned = problem_for(view, engine, tail, open_now=opened, slot=slot)
    warnings = [] if row.place == "wing" else [f"{engine_serial} is planned for {tail}, since it hangs on no tail"]
    planned, found = _solved(planned, limit_s, warnings)
    warnings.append(
        f"the engine may be opened at {len(found.points) - 1} points of the plan; a life is counted down to the last "
        "point that it reaches"
    )
    rules = _rules(found.fine, found.fine_points)
    return BuildPlan(
        planned, found.points, found.openings, found.best, rules, found.fine_points, found.fine, tuple(warnings)
    )


def _solved(planned: Planned, limit_s: float, warnings: list[str]) -> tuple[Planned, Searched]:
    """Return the best plan; where only the return's own margin cannot be had, without it and with a warning."""
    try:
        return planned, search(planned.problem, limit_s=limit_s)
    except NoSolutionError:
        if planned.problem.end_budget_degC is None:
            raise
        warnings.append("the margin that the lease asks for at its return cannot be reached; the plan goes without it")
        freed = planned._replace(problem=dataclasses.replace(planned.problem, end_budget_degC=None))
        return freed, search(freed.problem, limit_s=limit_s)


def _rules(fine: Openings, points: tuple[float, ...]) -> tuple[RuleCost, ...]:
    step = points[-1] / (len(points) - 1)
    found = []
    for name, rule in RULES:
        try:
            goal, played = (
                (1, play(fine, rule)) if rule == "run_out" else best_goal(fine, rule, goals_steps=goals_of(fine))
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
