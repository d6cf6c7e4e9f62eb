"""One option for every demand, at the least cost, when options share what there is only so much of.

A demand is a question that must have exactly one answer (which way out, which spare); an option is one answer with its
cost and the resources that it takes (a module serial, a slot, a day of the team). In arrays, with ``x`` = 1 for a
chosen option and ``p`` = 1 for a pair that came together:

    minimise    cost · x + sum_k together[k] · p[k]
    subject to  sum of x over a demand's options = 1
                sum of x over a resource's users <= capacity
                x[option] <= sum of x over what it needs
                p[k] >= sum of x over the sets of pair k - (sets - 1)

It is solved exactly. When nothing fits, the constraints that block are those of the nearest relaxation: the least
weighted number of demands left open, resources added and locks lifted that lets the rest fit.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from planner.minimise import Rows, minimise
from sim.errors import NoSolutionError, RequestError

_TIE_USD = 0.01  # a pair that costs nothing is still avoided where a plan of equal cost can
_LOCK, _RESOURCE, _DEMAND = 1.0, 3.0, 10.0  # what is given up first when nothing fits: a lock, capacity, a demand


class Together(NamedTuple):
    """What it costs when one option of every set is chosen; the options of one set answer the same demand."""

    sets: tuple[tuple[int, ...], ...]
    usd: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Choices:
    """The problem in arrays. ``demand`` and ``cost_usd`` have shape (options,), ``capacity`` (resources,).

    ``uses`` holds (option, resource, how many); ``needs`` holds an option and the options of which one must be chosen
    with it; ``locked`` holds options that stay.
    """

    demands: int
    demand: NDArray[np.int64]
    cost_usd: NDArray[np.float64]
    capacity: NDArray[np.int64] = field(default_factory=lambda: np.zeros(0, dtype=np.int64))
    uses: tuple[tuple[int, int, int], ...] = ()
    needs: tuple[tuple[int, tuple[int, ...]], ...] = ()
    together: tuple[Together, ...] = ()
    locked: tuple[int, ...] = ()


class Chosen(NamedTuple):
    """The option chosen for each demand, the pairs that came together, the cost and what was proven about it."""

    options: NDArray[np.int64]
    together: tuple[int, ...]
    cost_usd: float
    bound_usd: float

    @property
    def gap_frac(self) -> float:
        return max(0.0, self.cost_usd - self.bound_usd) / max(1.0, abs(self.cost_usd))

    @property
    def proven(self) -> bool:
        return self.gap_frac <= 1e-6


class Relaxation(NamedTuple):
    """One constraint that blocks: its kind (demand, resource, lock), its number, and by how much it must give."""

    kind: str
    number: int
    by: int


def choose(problem: Choices, *, limit_s: float = 60.0) -> Chosen | tuple[Relaxation, ...]:
    """Return the cheapest choice, or the nearest relaxation when no choice fits.

    Raises RequestError for a negative pair cost or a number out of range, NoSolutionError when time ran out first.
    """
    _check(problem)
    options, pairs = problem.cost_usd.size, len(problem.together)
    rows = _rows(problem)
    _add_pairs(rows, problem)
    extra = [max(pair.usd, 0.0) + _TIE_USD for pair in problem.together]
    cost = np.concatenate([problem.cost_usd, extra])
    found = minimise(cost, rows, whole=np.repeat([True, False], [options, pairs]), limit_s=limit_s)
    if found.infeasible:
        return nearest_relaxation(problem, limit_s=limit_s)
    if found.x is None:
        raise NoSolutionError("assignment", f"no plan was found in {limit_s:g} s; shorten the span of the plan")
    chosen = np.flatnonzero(found.x[:options] > 0.5)
    by_demand = chosen[np.argsort(problem.demand[chosen], kind="stable")]
    came = pairs_of(problem, by_demand)
    total = choice_usd(problem, by_demand)
    return Chosen(by_demand, came, total, min(total, found.bound - _TIE_USD * pairs))


def choice_usd(problem: Choices, options: NDArray[np.int64]) -> float:
    """Return what a choice costs, its pairs included."""
    pairs = sum(problem.together[pair].usd for pair in pairs_of(problem, options))
    return float(problem.cost_usd[options].sum()) + pairs


def pairs_of(problem: Choices, options: NDArray[np.int64]) -> tuple[int, ...]:
    """Return the numbers of the pairs of which every set has a chosen option."""
    chosen = set(options.tolist())
    return tuple(k for k, pair in enumerate(problem.together) if all(chosen & set(one) for one in pair.sets))


def nearest_relaxation(problem: Choices, *, limit_s: float = 60.0) -> tuple[Relaxation, ...]:
    """Return what must give, least first: locks are lifted before capacity is added before a demand is left open.

    An option whose need cannot be met is never allowed by a relaxation: needs are facts, not wishes.
    """
    options, demands, resources = problem.cost_usd.size, problem.demands, problem.capacity.size
    locks = len(problem.locked)
    rows = _rows(problem, slack_from=options)
    weight = np.concatenate(
        [
            np.zeros(options),
            np.full(demands, _DEMAND),
            np.full(resources, _RESOURCE),
            np.full(locks, _LOCK),
        ]
    )
    most = np.concatenate([np.ones(options + demands), np.full(resources, float(max(options, 1))), np.ones(locks)])
    found = minimise(weight, rows, whole=np.ones(weight.size, dtype=np.bool_), high=most, limit_s=limit_s)
    if found.x is None:
        raise NoSolutionError("assignment", f"no relaxation was found in {limit_s:g} s")
    slack = np.round(found.x[options:]).astype(int).tolist()
    kinds = ["demand"] * demands + ["resource"] * resources + ["lock"] * locks
    numbers = [*range(demands), *range(resources), *range(locks)]
    return tuple(Relaxation(kind, number, by) for kind, number, by in zip(kinds, numbers, slack, strict=True) if by > 0)


def _rows(problem: Choices, *, slack_from: int | None = None) -> Rows:
    """Return demands, resources, locks and needs; with slack columns behind the options when one asks for them."""
    rows = Rows()
    resources = problem.capacity.size
    of_demand: list[list[int]] = [[] for _ in range(problem.demands)]
    for option, demand in enumerate(problem.demand.tolist()):
        of_demand[demand].append(option)
    users: list[list[tuple[int, int]]] = [[] for _ in range(resources)]
    for option, resource, count in problem.uses:
        users[resource].append((option, count))

    def slack(number: int) -> list[int]:
        return [] if slack_from is None else [slack_from + number]

    for number, members in enumerate(of_demand):
        rows.add([*members, *slack(number)], 1.0, low=1.0, high=1.0)
    for number, using in enumerate(users):
        more = slack(problem.demands + number)
        counts = [*(float(count) for _, count in using), *(-1.0 for _ in more)]
        rows.add([*(option for option, _ in using), *more], counts, high=float(problem.capacity[number]))
    for number, option in enumerate(problem.locked):
        rows.add([option, *slack(problem.demands + resources + number)], 1.0, low=1.0)
    for option, needed in problem.needs:
        rows.add([option, *needed], [1.0] + [-1.0] * len(needed), high=0.0)
    return rows


def _add_pairs(rows: Rows, problem: Choices) -> None:
    for number, pair in enumerate(problem.together):
        members = [option for one in pair.sets for option in one]
        column = problem.cost_usd.size + number
        rows.add([*members, column], [1.0] * len(members) + [-1.0], high=len(pair.sets) - 1.0)


def _check(problem: Choices) -> None:
    options, resources = problem.cost_usd.size, problem.capacity.size
    if (problem.capacity < 0).any():
        raise RequestError("assignment", f"a capacity of {problem.capacity.min()}", "0 or more")
    if problem.demand.size != options or (problem.demand < 0).any() or (problem.demand >= problem.demands).any():
        raise RequestError("assignment", f"demand numbers {problem.demand.tolist()}", f"0 to {problem.demands - 1}")
    if any(pair.usd < 0 for pair in problem.together):
        raise RequestError("assignment", "a pair that costs less than 0", "0 or more")
    if any(not (0 <= o < options and 0 <= r < resources) for o, r, _ in problem.uses):
        raise RequestError("assignment", "a use of an option or resource that is not there", "numbers in range")
    for option in problem.locked:
        if not 0 <= option < options:
            raise RequestError("assignment", f"a lock on option {option}", f"0 to {options - 1}")
