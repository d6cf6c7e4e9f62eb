"""What to replace and restore at which opening of one engine: the published kernel with everything a shop visit adds.

Time is a list of points; the engine may be opened at every point but the last, which is the end of the plan (a lease
return, an exit, the horizon). At an opening the modules in front come off first, what is exposed is checked, parts in
an exposed module may be replaced for their price, and a module may be restored. Each part must be covered by its
first life or by an installation at all times; the modules' losses of margin together must stay within the budget.

    minimise  sum_t visit[t] z[t] + sum_mt open[m, t] w[m, t] + sum_j usd[j] x[j] + sum_i keep[i] k[i]
              + sum over runs of module m from s to e: run[m, s, e] y[m, s, e]
    subject to  every part and step: covered by k or by one x;   of what lasts to the end: at most one
                x of a part at t <= w[module, t];   y out of (m, s) <= w[m, s];   w[m, t] <= w[front, t] <= z[t]
                y of a module is one unbroken chain of runs from now to the end
                every point t: sum over the runs that pass t of the loss then <= budget[t]
                every used part: bought at most once

On its points the answer is exact. A part's coverage and a module's chain are interval matrices, so the relaxation is
no weaker than that of the published form; see planner/replacement.py for its source.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from planner.build_cuts import covers, gates
from planner.minimise import Minimum, Rows, minimise
from planner.openings import Floats, Install, Openings
from sim.errors import NoSolutionError, RequestError

_ROUND_USD = 1.0  # a known plan's cost is summed in another order than the solver's


class Opened(NamedTuple):
    """What is done at each point: modules opened and restored (modules, steps), installations chosen, and the money."""

    opened: NDArray[np.bool_]
    restored: NDArray[np.bool_]
    installs: tuple[Install, ...]
    cost_usd: float
    bound_usd: float

    @property
    def gap_frac(self) -> float:
        return max(0.0, self.cost_usd - self.bound_usd) / max(1.0, abs(self.cost_usd))


class _Columns(NamedTuple):
    """Where each kind of variable begins."""

    visit: int
    open: int
    restore: int
    install: int
    keep: int
    run: int
    total: int
    runs: tuple[tuple[int, int, int], ...]  # (module, from point or -1 for the run under way, to point)


def open_at_best(problem: Openings, *, limit_s: float = 60.0, known: Opened | None = None) -> Opened:
    """Return the cheapest plan on the points.

    ``known`` is a plan that keeps everything: nothing dearer is looked for, and it is the answer when time runs out
    before anything better is found. Raises NoSolutionError when nothing keeps the limits and the margin.
    """
    _check(problem)
    columns = _columns(problem)
    rows = Rows()
    _add_openings(rows, problem, columns)
    _add_parts(rows, problem, columns)
    _add_runs(rows, problem, columns)
    _add_covers(rows, problem, columns)
    whole = np.arange(columns.total) < columns.run
    cost = _cost(problem, columns)
    if known is not None:
        counted = np.flatnonzero(cost)
        rows.add(counted.tolist(), cost[counted].tolist(), high=known.cost_usd + _ROUND_USD)
    found = minimise(cost, rows, whole=whole, limit_s=limit_s)
    if known is not None and (found.x is None or found.cost > known.cost_usd):
        bound = found.bound if found.bound > -np.inf else minimise(cost, rows).cost
        return known._replace(bound_usd=known.cost_usd if found.infeasible else min(bound, known.cost_usd))
    if found.infeasible:
        raise NoSolutionError("build plan", _why_nothing_fits(problem))
    if found.x is None:
        raise NoSolutionError("build plan", f"nothing was found in {limit_s:.1f} s; allow more time")
    return _read(problem, columns, found)


def _columns(problem: Openings) -> _Columns:
    modules, steps = problem.open_usd.shape
    runs = tuple(
        (module, start, end)
        for module in range(modules)
        for start in range(-1, steps)
        for end in range(start + 1, steps + 1)
        # A run that alone loses more than all modules together may is left out; point 0 asks for no margin.
        if end == 0 or _lost(problem, module, start, end) <= problem.budget_degC[end]
    )
    visit, opening = 0, steps
    restore = opening + modules * steps
    install = restore + modules * steps
    keep = install + len(problem.installs)
    run = keep + problem.keep_until.size
    return _Columns(visit, opening, restore, install, keep, run, run + len(runs), runs)


def _lost(problem: Openings, module: int, start: int, point: int) -> float:
    """Return what a module has lost at a point of the run that began at ``start`` (-1: the run under way)."""
    if start < 0:
        return float(problem.first_loss_degC[module, point])
    return float(problem.run_loss_degC[module, start, point])


def _cost(problem: Openings, at: _Columns) -> Floats:
    runs = [
        problem.first_run_usd[module, end] if start < 0 else problem.run_usd[module, start, end]
        for module, start, end in at.runs
    ]
    return np.concatenate(
        [
            problem.visit_usd,
            problem.open_usd.ravel(),
            np.zeros(problem.open_usd.size),
            [install.usd for install in problem.installs],
            np.where(problem.keep_until >= problem.visit_usd.size, problem.keep_usd, 0.0),
            runs,
        ]
    )


def _add_openings(rows: Rows, problem: Openings, at: _Columns) -> None:
    """A module is opened only in a visit and behind what stands in front of it; it is restored only when open."""
    modules, steps = problem.open_usd.shape
    for module in range(modules):
        fronts = np.flatnonzero(problem.in_front[module]).tolist()
        for step in range(steps):
            mine = at.open + module * steps + step
            before = [at.open + front * steps + step for front in fronts] or [at.visit + step]
            for other in before:
                rows.add((mine, other), (1.0, -1.0), high=0.0)
            rows.add((at.restore + module * steps + step, mine), (1.0, -1.0), high=0.0)
    if problem.must_visit:
        rows.add((at.visit,), 1.0, low=1.0)
    for module in problem.must_open:
        rows.add((at.open + module * steps,), 1.0, low=1.0)
    for module in problem.must_restore:
        rows.add((at.restore + module * steps,), 1.0, low=1.0)


def _add_parts(rows: Rows, problem: Openings, at: _Columns) -> None:
    """Every step of every part is covered, replacing needs the module open, a used part exists once."""
    steps = problem.visit_usd.size
    stocks: dict[int, list[int]] = {}
    for part in range(problem.keep_until.size):
        mine = [(at.install + j, one) for j, one in enumerate(problem.installs) if one.part == part]
        keep, kept_until = at.keep + part, int(problem.keep_until[part])
        for step in range(steps):
            cover = [column for column, one in mine if one.at <= step < one.until]
            rows.add([keep, *cover] if step < kept_until else cover, 1.0, low=1.0)
            now = [column for column, one in mine if one.at == step]
            opened = at.open + int(problem.part_module[part]) * steps + step
            if now:
                rows.add([*now, opened], [1.0] * len(now) + [-1.0], high=0.0)
        to_the_end = [column for column, one in mine if one.until >= steps]
        rows.add([keep, *to_the_end] if kept_until >= steps else to_the_end, 1.0, high=1.0)
        for column, one in mine:
            if one.stock >= 0:
                stocks.setdefault(one.stock, []).append(column)
    for columns in stocks.values():
        rows.add(columns, 1.0, high=1.0)


def _add_runs(rows: Rows, problem: Openings, at: _Columns) -> None:
    """Each module's runs form one chain, and the losses of all modules together stay within the budget."""
    modules, steps = problem.open_usd.shape
    out: dict[tuple[int, int], list[int]] = {}
    into: dict[tuple[int, int], list[int]] = {}
    for number, (module, start, end) in enumerate(at.runs):
        out.setdefault((module, start), []).append(at.run + number)
        into.setdefault((module, end), []).append(at.run + number)
    for module in range(modules):
        rows.add(out.get((module, -1), ()), 1.0, low=1.0, high=1.0)
        rows.add(into.get((module, steps), ()), 1.0, low=1.0, high=1.0)
        for step in range(steps):
            restore = at.restore + module * steps + step
            for flow in (out.get((module, step), []), into.get((module, step), [])):
                rows.add([*flow, restore], [1.0] * len(flow) + [-1.0], low=0.0, high=0.0)
    for point in range(1, steps + 1):
        if not np.isfinite(problem.budget_degC[point]):
            continue
        passing = [
            (at.run + number, module, start)
            for number, (module, start, end) in enumerate(at.runs)
            if start < point <= end
        ]
        losses = [_lost(problem, module, start, point) for _, module, start in passing]
        rows.add([column for column, _, _ in passing], losses, high=float(problem.budget_degC[point]))


def _add_covers(rows: Rows, problem: Openings, at: _Columns) -> None:
    """Say what the margin demands as covers of restorations, and of the openings and visits that they need."""
    steps, said = problem.visit_usd.size, set()
    for cover in covers(problem):
        window = range(cover.since, cover.point)
        rows.add([at.restore + module * steps + q for module in cover.modules for q in window], 1.0, low=1.0)
        for gate in gates(problem, cover) or (-1,):
            if (gate, cover.since, cover.point) not in said:
                said.add((gate, cover.since, cover.point))
                first = at.visit if gate < 0 else at.open + gate * steps
                rows.add([first + q for q in window], 1.0, low=1.0)


def _read(problem: Openings, at: _Columns, found: Minimum) -> Opened:
    modules, steps = problem.open_usd.shape
    assert found.x is not None
    opened: NDArray[np.bool_] = found.x[at.open : at.restore].reshape(modules, steps) > 0.5
    restored: NDArray[np.bool_] = found.x[at.restore : at.install].reshape(modules, steps) > 0.5
    chosen = tuple(one for one, x in zip(problem.installs, found.x[at.install : at.keep], strict=True) if x > 0.5)
    return Opened(opened, restored, _needed(problem, chosen), found.cost, found.bound)


def _needed(problem: Openings, chosen: tuple[Install, ...]) -> tuple[Install, ...]:
    """Return the installations without those that cost nothing and cover nothing that is not covered anyway."""
    steps, needed = problem.visit_usd.size, list(chosen)
    for one in chosen:
        spans = [(other.at, other.until) for other in needed if other.part == one.part and other is not one]
        spans.append((0, int(problem.keep_until[one.part])))
        if one.usd == 0 and all(any(a <= step < b for a, b in spans) for step in range(steps)):
            needed.remove(one)
    return tuple(needed)


def _why_nothing_fits(problem: Openings) -> str:
    """Return which constraint cannot be kept even when everything is done at every opening."""
    steps = problem.visit_usd.size
    for part in range(problem.keep_until.size):
        for step in range(steps):
            covered = step < problem.keep_until[part] or any(
                one.part == part and one.at <= step < one.until for one in problem.installs
            )
            if not covered:
                return f"part {part} has no life and no replacement from point {step} on"
    least = problem.first_loss_degC.min(axis=0) * 0.0
    for point in range(1, steps + 1):
        fresh = problem.run_loss_degC[:, :point, point].min(axis=1)
        least[point] = np.minimum(fresh, problem.first_loss_degC[:, point]).sum()
        if least[point] > problem.budget_degC[point]:
            return (
                f"restored modules still lose {least[point]:.1f} degC by point {point}, "
                f"more than the {problem.budget_degC[point]:.1f} degC there are"
            )
    return "limits and margin cannot be kept together"


def _check(problem: Openings) -> None:
    steps = problem.visit_usd.size
    if steps < 1:
        raise RequestError("build plan", "no step", "at least one point before the end")
    for one in problem.installs:
        if not 0 <= one.at < one.until <= steps:
            raise RequestError("build plan", f"an installation from point {one.at} to {one.until}", f"0 to {steps}")
