"""The removals ahead, engine by engine: the first three causes with their dates, and what binds, in words."""

from __future__ import annotations

import datetime as dt
from collections import defaultdict
from collections.abc import Sequence
from typing import Any, NamedTuple

import numpy as np

from planner.causes_ahead import LEVELS, Ahead, Chance, Months, Planned, first_removal, quantile_days
from planner.picture import Picture
from sim.fleet import Base
from sim.redline import hottest_ambient
from sim.removal import margin_now

Row = dict[str, Any]
CAUSES_SHOWN = 3
_CHANCE = ("distress", "unscheduled", "early")
_FAR_YEARS = 40
_NEVER_DAYS = _FAR_YEARS * 365.25
WORDS = {
    "limit": "limit of {part} in the {module}",
    "directive": "directive on {part} in the {module}",
    "unknown_life": "{part} in the {module} flies without a known life: stop",
    "finding": "recorded finding in the {module}",
    "margin": "EGT margin used up",
    "lease_end": "end of the lease-in",
    "return": "return of {tail} to its lessor",
    "exit": "{tail} leaves the fleet",
    "distress": "hot-section distress",
    "unscheduled": "unscheduled cause",
    "early": "early failure after the last build",
}


class Cause(NamedTuple):
    """One cause of an engine: name, slot (-1: whole engine or several modules), part, days by LEVELS (inf:
    never), and
    the chance that it is the one that takes the engine off within 40 years."""

    cause: str
    slot: int
    part_serial: str
    days: tuple[float, ...]
    first_chance: float


def causes_of(one: Ahead) -> tuple[Cause, ...]:
    """Return every cause of an engine, the earliest median first (of equals the one more likely to come first)."""
    far = Months(np.linspace(0.0, _NEVER_DAYS, _FAR_YEARS * 4 + 1))
    law = first_removal(one, far)
    chance: dict[str, float] = defaultdict(float)
    for column, (cause, slot) in enumerate(law.causes):
        share = float(law.by_month[:, column].sum())
        chance[cause if slot < 0 or cause in _CHANCE else f"{cause}/{slot}"] += share
    found = [_planned(p, chance) for p in one.planned]
    by_name: dict[str, list[Chance]] = defaultdict(list)
    for single in one.chances:
        by_name[single.cause].append(single)
    for name, group in by_name.items():
        days = quantile_days(group, one.use)
        slots = {single.slot for single in group}
        found.append(Cause(name, slots.pop() if len(slots) == 1 else -1, "", days, chance.get(name, 0.0)))
    return tuple(sorted(found, key=lambda c: (c.days[1], -c.first_chance, c.cause, c.slot)))


def _planned(one: Planned, chance: dict[str, float]) -> Cause:
    key = one.cause if one.slot < 0 else f"{one.cause}/{one.slot}"
    # only the first planned cause can come first; a later one is cut off by it
    return Cause(one.cause, one.slot, one.part_serial, (one.day,) * len(LEVELS), chance.pop(key, 0.0))


def words(view: Picture, one: Ahead, cause: str, slot: int, part: str) -> str:
    """Return a cause in words."""
    kind = view.engines[one.engine_serial].spec
    module = kind.modules[slot].module if slot >= 0 else ""
    text = WORDS.get(cause, cause.replace("_", " "))
    found = text.format(part=part or "a part", module=module, tail=one.tail)
    return f"{found} ({module})" if module and "{module}" not in text else found


def binding(view: Picture, one: Ahead, causes: Sequence[Cause]) -> str:
    """Return in one sentence what ends the installation, and how likely something else comes before."""
    planned = one.planned[0] if one.planned else None
    if planned is None:
        best = max(causes, key=lambda c: c.first_chance, default=None)
        return f"chance only: most likely {words(view, one, *best[:3])}" if best else "nothing known"
    what = words(view, one, planned.cause, planned.slot, planned.part_serial)
    if planned.day <= one.use.since:
        return f"{what}, now"
    on = f"{what} on {view.setup.season.date(planned.day).isoformat()}"
    before = {c: c.first_chance for c in causes if c.cause in _CHANCE}
    total = sum(before.values())
    if total < 0.01:
        return on
    most = max(before, key=lambda c: before[c])
    return f"{on}; {total:.0%} come off before, mostly for {words(view, one, *most[:3])}"


def summer_end(as_of: dt.date) -> float:
    """Return the day on which the summer at hand (or the next one) is over: 30 September."""
    year = as_of.year if as_of <= dt.date(as_of.year, 9, 30) else as_of.year + 1
    return float((dt.date(year, 9, 30) - as_of).days)


def still_on_chance(one: Ahead, day: float) -> float:
    """Return the chance that an engine is on still after a day."""
    if one.planned_day <= day:
        return 0.0
    return float(first_removal(one, Months(np.array([0.0, max(day, 1e-6)]))).still_on[0])


def engine_rows(view: Picture, engines_ahead: Sequence[Ahead]) -> tuple[list[Row], list[Row]]:
    """Return the rows of removals_ahead and of engines_ahead, engines in order of P50."""
    causes_rows: list[Row] = []
    engines: list[Row] = []
    bases = {base.base: base for base in view.fleet.bases}
    summer = summer_end(view.fleet.settings.as_of)
    for one in engines_ahead:
        engine, row = view.engines[one.engine_serial], view.tails[one.tail].row
        head = {
            "engine_serial": one.engine_serial,
            "engine_type": row.engine_type,
            "tail": one.tail,
            "base": row.base,
        }
        causes = causes_of(one)
        for rank, cause in enumerate(causes[:CAUSES_SHOWN], start=1):
            module = engine.spec.modules[cause.slot].module if cause.slot >= 0 else ""
            causes_rows.append(
                head
                | {"rank": rank, "cause": cause.cause, "module": module, "part_serial": cause.part_serial}
                | _dates(view, cause.days)
                | {"first_chance": min(1.0, cause.first_chance)}
            )
        days = quantile_days(one.chances, one.use, stop=one.planned_day)
        engines.append(
            head
            | _dates(view, days)
            | {"binding": binding(view, one, causes), "summer_chance": still_on_chance(one, summer)}
            | _heat(view, one, bases.get(row.base))
            | {"_day": days[1]}
        )
    engines.sort(key=lambda r: (r["_day"], r["engine_serial"]))
    order = {r["engine_serial"]: i for i, r in enumerate(engines)}
    causes_rows.sort(key=lambda r: (order[r["engine_serial"]], r["rank"]))
    for r in engines:
        del r["_day"]
    return causes_rows, engines


def _dates(view: Picture, days: Sequence[float]) -> Row:
    return {
        f"date_{name}": view.setup.season.date(day) if day < _NEVER_DAYS else None
        for name, day in zip(("p10", "p50", "p90"), days, strict=True)
    }


def _heat(view: Picture, one: Ahead, base: Base | None) -> Row:
    """Return the margin today, the hottest ambient that it keeps the redline to, and whether the base stays below
    it."""
    engine = view.engines[one.engine_serial]
    if not engine.modules:
        return {"margin_degC": None, "hottest_degC": None, "hot_day": None}
    kind = next(t for t in view.fleet.engine_types if t.engine_type == engine.spec.engine_type)
    margin = margin_now(engine, view.tails[one.tail].flying)
    hottest = hottest_ambient(
        corner_point_degC=kind.corner_point_degC, margin_degC=margin, egt_per_ambient=kind.egt_per_ambient
    )
    known = [day for day in base.hot_day_degC if day is not None] if base else []
    return {
        "margin_degC": margin,
        "hottest_degC": hottest,
        "hot_day": None if not known else ("yes" if hottest >= max(known) else "no"),
    }
