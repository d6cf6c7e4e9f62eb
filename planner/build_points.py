"""From one engine's lives, wear and prices in cycles to the points on which its build plan is solved.

The points are the present limits (the soonest of them exactly), the run-out of the margin when nothing is done, and an
even step up to the end. A life is counted down to the last point that it reaches, never beyond, so a plan on the points
keeps every limit; what the rounding costs is at most one step of each later life.
"""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Callable
from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from planner.openings import Install, Openings
from sim.errors import RequestError

Money = Callable[[float], float]  # cycles from now -> USD of today
Life = Callable[[float], float]  # cycles from now at installation -> cycles that it may fly from then on

_EXACT_LIMITS = 6  # how many of the soonest dates become points of their own
_NEAR_FRAC = 0.25  # two points nearer than this share of a step become one, the earlier


class UsedPart(NamedTuple):
    """A part of known remaining life that can be had once: its life when installed, price, from when it is there."""

    part_serial: str
    life: Life
    price: Money
    from_cycles: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class BuildPart:
    """A part that carries life: what it has left, life and price of a new one, used ones, worth at the end.

    ``end`` gives the money (present value, negative to pay) for so many cycles left at the end of the plan.
    """

    part_serial: str
    part_number: str
    module: int
    left_cycles: int
    life: Life
    price: Money
    end: Money
    used: tuple[UsedPart, ...] = ()


@dataclass(frozen=True, slots=True, kw_only=True)
class BuildModule:
    """A module: the modules in front of it, prices of opening (with its check) and restoring, wear, risk, worth.

    ``loss_now`` gives degC lost after so many cycles from now when it is not restored, ``loss_after`` after so many
    cycles from its restoration; ``risk`` the expected removals for distress up to an age; ``risk_usd`` what one costs;
    ``end`` the money at the end of the plan for an age since restoration.
    """

    module: str
    module_serial: str
    in_front: tuple[int, ...]
    open: Money
    restore: Money
    age_cycles: float
    loss_now: Callable[[float], float]
    loss_after: Callable[[float], float]
    end: Money
    risk: Callable[[float], float] = lambda _: 0.0
    risk_usd: Money = lambda _: 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class BuildProblem:
    """One engine from now to the end of the plan. ``visit`` is what an opening costs that no module carries.

    ``budget_degC`` is the loss that uses the margin up, by cycles from now; ``end_budget_degC`` what may be lost at the
    end.
    """

    modules: tuple[BuildModule, ...]
    parts: tuple[BuildPart, ...]
    end_cycles: float
    visit: Money
    budget_degC: Callable[[float], float]
    end_budget_degC: float | None = None
    must_visit: bool = False
    must_open: tuple[int, ...] = ()
    must_restore: tuple[int, ...] = ()


def points_of(problem: BuildProblem, *, step_cycles: float) -> tuple[float, ...]:
    """Return the points in cycles from now: 0, the soonest limits, the margin's run-out, the even step, the end."""
    end = problem.end_cycles
    if not 0 < step_cycles <= end:
        raise RequestError("build plan, step", f"{step_cycles:g} cycles", f"more than 0, up to the end {end:g}")
    soonest = sorted({float(p.left_cycles) for p in problem.parts if 0 < p.left_cycles < end})[:_EXACT_LIMITS]
    run_out = _margin_run_out(problem)
    if run_out is not None:
        soonest.append(run_out)
    even = [float(round(step * step_cycles)) for step in range(1, int(np.ceil(end / step_cycles)))]
    exact = {0.0, end, *soonest}
    points = sorted(exact)
    for point in even:
        if min(abs(point - other) for other in exact) > _NEAR_FRAC * step_cycles:
            points.append(point)
    return tuple(sorted(points))


def openings_of(problem: BuildProblem, *, points: tuple[float, ...]) -> Openings:
    """Return the kernel's arrays for the points."""
    steps, modules = len(points) - 1, problem.modules
    starts = points[:-1]
    run_usd = np.zeros((len(modules), steps, steps + 1))
    run_loss = np.zeros_like(run_usd)
    first_usd = np.zeros((len(modules), steps + 1))
    first_loss = np.zeros_like(first_usd)
    for number, module in enumerate(modules):
        for end, at in enumerate(points):
            first_usd[number, end] = _run_usd(module, module.age_cycles, at, until=at, last=end == steps)
            first_loss[number, end] = module.loss_now(at)
            for start in range(min(end, steps)):
                age = at - points[start]
                risk = _run_usd(module, 0.0, age, until=at, last=end == steps)
                run_usd[number, start, end] = module.restore(points[start]) + risk
                run_loss[number, start, end] = module.loss_after(age)
    budget = np.array([problem.budget_degC(at) for at in points])
    if problem.end_budget_degC is not None:
        budget[steps] = min(budget[steps], problem.end_budget_degC)
    in_front = np.zeros((len(modules), len(modules)), dtype=np.bool_)
    for number, module in enumerate(modules):
        in_front[number, list(module.in_front)] = True
    return Openings(
        visit_usd=np.array([problem.visit(at) for at in starts]),
        open_usd=np.array([[module.open(at) for at in starts] for module in modules]),
        run_usd=run_usd,
        first_run_usd=first_usd,
        run_loss_degC=run_loss,
        first_loss_degC=first_loss,
        budget_degC=budget,
        in_front=in_front,
        part_module=np.array([part.module for part in problem.parts], dtype=np.int64),
        keep_until=np.array([_reached(points, 0.0, part.left_cycles) for part in problem.parts], dtype=np.int64),
        keep_usd=np.array([-part.end(part.left_cycles - points[-1]) for part in problem.parts]),
        installs=_installs(problem, points),
        must_visit=problem.must_visit,
        must_open=problem.must_open,
        must_restore=problem.must_restore,
    )


def _run_usd(module: BuildModule, age: float, length: float, *, until: float, last: bool) -> float:
    """Return the expected distress of a run from an age on, less the worth of the module if the plan ends with it."""
    risk = module.risk(age + length) - module.risk(age)
    return risk * module.risk_usd(until) - (module.end(age + length) if last else 0.0)


def _installs(problem: BuildProblem, points: tuple[float, ...]) -> tuple[Install, ...]:
    """Return every way to install a part: a new one at each point, a used one wherever it is there and lasts a step."""
    steps, end = len(points) - 1, points[-1]
    stocks: dict[str, int] = {}
    found = []
    for number, part in enumerate(problem.parts):
        new = UsedPart("", part.life, part.price)
        for kind in (new, *part.used):
            stock = stocks.setdefault(kind.part_serial, len(stocks)) if kind.part_serial else -1
            for at, cycles in enumerate(points[:-1]):
                life = kind.life(cycles)
                until = _reached(points, cycles, life)
                if cycles < kind.from_cycles or until <= at:
                    continue
                worth = part.end(cycles + life - end) if until == steps else 0.0
                found.append(Install(number, at, until, kind.price(cycles) - worth, stock))
    return tuple(found)


def used_serials(problem: BuildProblem) -> tuple[str, ...]:
    """Return the used parts in the order of their stock numbers."""
    return tuple(dict.fromkeys(used.part_serial for part in problem.parts for used in part.used))


def _reached(points: tuple[float, ...], start: float, life: float) -> int:
    """Return the last point that a life begun at ``start`` reaches (0 for a life of nothing)."""
    return max(0, bisect_right(points, start + life + 1e-9) - 1)


def _margin_run_out(problem: BuildProblem) -> float | None:
    """Return the last whole cycle within the margin when nothing is restored, None when it lasts to the end."""

    def within(cycles: float) -> bool:
        return sum(module.loss_now(cycles) for module in problem.modules) <= problem.budget_degC(cycles)

    if within(problem.end_cycles) or not within(1.0):
        return None
    low, high = 1, int(np.ceil(problem.end_cycles))
    while high - low > 1:
        middle = (low + high) // 2
        low, high = (middle, high) if within(middle) else (low, middle)
    return float(low)
