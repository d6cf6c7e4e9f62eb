"""A build plan as tables: actions by date, parts at the first opening, spans of life, rules and what they lose."""

from __future__ import annotations

import datetime as dt
import math
from typing import Any

import numpy as np

from planner.build import BuildPlan, visited
from planner.build_points import UsedPart
from planner.openings import Install, opened_for

Row = dict[str, Any]


def actions(plan: BuildPlan) -> list[Row]:
    """Return what is done at each opening: the visit, modules checked and restored, parts; costs are present values."""
    problem, openings = plan.planned.problem, plan.openings
    opened = opened_for(openings, restored=plan.best.restored, installs=plan.best.installs)
    serial, shop = plan.planned.engine.serial, plan.planned.shop.shop
    rows: list[Row] = []
    for point in plan.visits:
        date = _date(plan, point)
        modules = np.flatnonzero(opened[:, point]).tolist()
        names = ", ".join(problem.modules[m].module for m in modules) or "nothing"
        exposed = float(openings.visit_usd[point] + openings.open_usd[modules, point].sum())
        rows.append(
            {
                "date": date,
                "what": "visit",
                "serials": serial,
                "from": plan.planned.tail,
                "to": shop,
                "before": _left_text(plan, point, after=False),
                "after": _left_text(plan, point, after=True),
                "cost_usd": exposed,
                "reason": f"opening with access and checks of: {names}",
                "limit_before_cycles": _least_left(plan, point, after=False),
                "limit_after_cycles": _least_left(plan, point, after=True),
            }
        )
        for module in np.flatnonzero(plan.best.restored[:, point]).tolist():
            rows.append(_restored(plan, module, point, date))
        rows += [_replaced(plan, one, date) for one in plan.best.installs if one.at == point]
    return rows


def _restored(plan: BuildPlan, module: int, point: int, date: dt.date) -> Row:
    one = plan.planned.problem.modules[module]
    age = _age_at(plan, module, point)
    return {
        "date": date,
        "what": "restore",
        "serials": one.module_serial,
        "from": "",
        "to": plan.planned.shop.shop,
        "before": f"{age:,.0f} cycles since restoration, {_lost_at(plan, module, point):.1f} degC lost",
        "after": f"{one.loss_after(0.0):.1f} degC lost",
        "cost_usd": one.restore(plan.points[point]),
        "reason": f"{one.module} restored while it is open",
    }


def _replaced(plan: BuildPlan, install: Install, date: dt.date) -> Row:
    part = plan.planned.problem.parts[install.part]
    at = plan.points[install.at]
    left = _left_before(plan, install.part, install.at)
    source = _source(plan, install)
    used = source.part_serial
    price, life = source.price(at), source.life(at)
    return {
        "date": date,
        "what": "replace",
        "serials": " ".join(filter(None, (part.part_serial, used))),
        "from": f"used part {used}" if used else f"new {part.part_number}",
        "to": plan.planned.problem.modules[part.module].module_serial,
        "before": f"{left:,.0f} cycles left",
        "after": f"{life:,.0f} cycles left",
        "cost_usd": price,
        "reason": _why(plan, install, left),
    }


def _source(plan: BuildPlan, install: Install) -> UsedPart:
    """Return what goes in: the used part, or a new one under a blank serial."""
    part = plan.planned.problem.parts[install.part]
    if install.stock < 0:
        return UsedPart("", part.life, part.price)
    return next(used for used in part.used if used.part_serial == plan.used[install.stock])


def _why(plan: BuildPlan, install: Install, left: float) -> str:
    if left < 1:
        return "at its limit"
    following = [point for point in plan.visits if point > install.at]
    to_next = plan.points[following[0] if following else -1] - plan.points[install.at]
    if left < to_next:
        return f"would not reach the next opening in {to_next:,.0f} cycles"
    return f"cheaper now, while its module is open, than at a later opening; {left:,.0f} cycles are thrown away"


def parts(plan: BuildPlan) -> list[Row]:
    """Return every part at the first opening: left alone, new or used, with what it has before and after."""
    if not plan.visits:
        return []
    first, rows = plan.visits[0], []
    for number, part in enumerate(plan.planned.problem.parts):
        install = next((one for one in plan.best.installs if (one.part, one.at) == (number, first)), None)
        left = _left_before(plan, number, first)
        row: Row = {
            "date": _date(plan, first),
            "part_serial": part.part_serial,
            "part_number": part.part_number,
            "module_serial": plan.planned.problem.modules[part.module].module_serial,
            "left_before_cycles": round(left),
        }
        if install is None:
            reached = _until_next(plan, number, first)
            row |= {"decision": "leave", "used_serial": "", "left_after_cycles": round(left), "stub_cycles": 0}
            row |= {"cost_usd": 0.0, "reason": reached}
        else:
            done = _replaced(plan, install, _date(plan, first))
            source = _source(plan, install)
            used, life = source.part_serial, source.life(plan.points[first])
            row |= {"decision": "used" if used else "new", "used_serial": used, "left_after_cycles": round(life)}
            row |= {"stub_cycles": round(left), "cost_usd": done["cost_usd"], "reason": done["reason"]}
        rows.append(row)
    return rows


def _until_next(plan: BuildPlan, part: int, point: int) -> str:
    later = [one.at for one in plan.best.installs if one.part == part and one.at > point]
    if not later:
        return "lasts to the end of the plan"
    return f"goes at the opening of {_date(plan, min(later))}"


def spans(plan: BuildPlan) -> list[Row]:
    """Return the time line: stretches of each part and module between openings, up to the end of the plan."""
    problem, end = plan.planned.problem, len(plan.points) - 1
    rows = []
    for number, part in enumerate(problem.parts):
        name = problem.modules[part.module].module
        moves = sorted((one.at, one) for one in plan.best.installs if one.part == number)
        starts = [(0, "in now", part.part_serial)] if not moves or moves[0][0] > 0 else []
        for at, one in moves:
            used = _source(plan, one).part_serial
            starts.append((at, "used" if used else "new", used or "new"))
        rows += _stretches(plan, f"{name} {part.part_number} {part.part_serial}", name, starts, end)
    for number, module in enumerate(problem.modules):
        times = np.flatnonzero(plan.best.restored[number]).tolist()
        starts = [(0, "in now", module.module_serial)] if not times or times[0] > 0 else []
        starts += [(at, "restored", module.module_serial) for at in times]
        rows += _stretches(plan, f"{module.module} module", module.module, starts, end)
    return rows


def _stretches(plan: BuildPlan, lane: str, module: str, starts: list[tuple[int, str, str]], end: int) -> list[Row]:
    ends = [*(start[0] for start in starts[1:]), end]
    return [
        {
            "lane": lane,
            "module": module,
            "serial": serial,
            "kind": kind,
            "from_cycles": round(plan.points[start]),
            "to_cycles": round(plan.points[stop]),
            "from_date": _date(plan, start),
            "to_date": _date(plan, stop),
        }
        for (start, kind, serial), stop in zip(starts, ends, strict=True)
        if stop > start
    ]


def rules(plan: BuildPlan) -> list[Row]:
    """Return the best plan and every simple rule with the money that it loses."""
    cycles = plan.planned.problem.end_cycles
    rows: list[Row] = [
        {
            "rule": "best",
            "goal_cycles": plan.build_goal_cycles,
            "cost_usd": plan.cost_usd,
            "usd_per_cycle": plan.usd_per_cycle,
            "loses_usd": 0.0,
            "openings": len(plan.visits),
        }
    ]
    for rule in plan.rules:
        count = None
        if rule.played is not None:
            count = int(visited(plan.fine, rule.played.restored, rule.played.installs).sum())
        rows.append(
            {
                "rule": rule.rule,
                "goal_cycles": rule.goal_cycles,
                "cost_usd": rule.cost_usd,
                "usd_per_cycle": None if rule.cost_usd is None else rule.cost_usd / cycles,
                "loses_usd": None if rule.cost_usd is None else rule.cost_usd - plan.cost_usd,
                "openings": count,
            }
        )
    return rows


def remainder_usd(plan: BuildPlan) -> float:
    """Return what the objective holds beyond the actions: expected distress, less what is left at the end."""
    return plan.cost_usd - math.fsum(row["cost_usd"] for row in actions(plan))


def _date(plan: BuildPlan, point: int) -> dt.date:
    return plan.planned.view.setup.season.date(plan.planned.use.day(plan.points[point]))


def _left_before(plan: BuildPlan, part: int, point: int) -> float:
    """Return what a part has left when a point is reached, before anything is done there."""
    at = plan.points[point]
    before = [one for one in plan.best.installs if one.part == part and one.at < point]
    if not before:
        return max(0.0, plan.planned.problem.parts[part].left_cycles - at)
    last = max(before, key=lambda one: one.at)
    start = plan.points[last.at]
    return max(0.0, start + _source(plan, last).life(start) - at)


def _least_left(plan: BuildPlan, point: int, *, after: bool) -> int:
    lefts = []
    for number in range(len(plan.planned.problem.parts)):
        done = [one for one in plan.best.installs if (one.part, one.at) == (number, point)]
        if after and done:
            lefts.append(_source(plan, done[0]).life(plan.points[point]))
        else:
            lefts.append(_left_before(plan, number, point))
    return round(min(lefts)) if lefts else 0


def _left_text(plan: BuildPlan, point: int, *, after: bool) -> str:
    return f"{_least_left(plan, point, after=after):,} cycles to the next part limit"


def _age_at(plan: BuildPlan, module: int, point: int) -> float:
    before = [t for t in np.flatnonzero(plan.best.restored[module]).tolist() if t < point]
    if before:
        return plan.points[point] - plan.points[before[-1]]
    return plan.planned.problem.modules[module].age_cycles + plan.points[point]


def _lost_at(plan: BuildPlan, module: int, point: int) -> float:
    before = [t for t in np.flatnonzero(plan.best.restored[module]).tolist() if t < point]
    one = plan.planned.problem.modules[module]
    if before:
        return one.loss_after(plan.points[point] - plan.points[before[-1]])
    return one.loss_now(plan.points[point])
