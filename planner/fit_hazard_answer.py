"""What the past removals say, as rows: each hazard with its intervals and how far to trust it, and trends of types."""

from __future__ import annotations

import datetime as dt
from collections import defaultdict
from typing import Any, NamedTuple

import numpy as np

from planner.fit_hazard import Fit, Lives, constant_hazard_chance, held_shape, weibull
from planner.fit_hazard_check import goodness
from planner.fit_hazard_early import early_chance
from planner.fit_hazard_records import Group, Stretch, groups, lives_of
from planner.fit_hazard_replace import best_age
from planner.fit_hazard_trend import LEAST_FAILURES, power_law
from sim.errors import NoSolutionError
from sim.fleet import Fleet

Row = dict[str, Any]

# Below ten failures a shape is luck: its interval spans a factor of three and more. Below thirty it is rough.
LEAST_FOR_SHAPE, FEW = 10, 30
SURE = 0.05
DAYS_PER_YEAR = 365.25


class HazardTables(NamedTuple):
    """Rows of hazards_fitted and removal_trends, and what was assumed."""

    hazards: list[Row]
    trends: list[Row]
    warnings: list[str]


def hazard_tables(fleet: Fleet, found: list[Stretch]) -> HazardTables:
    """Return the rows for every chance cause that the table or the records know."""
    warnings: list[str] = []
    early_named = any(one.failed and one.cause == "early" for one in found)
    rows: list[Row] = []
    for group in groups(fleet, found):
        if group.cause == "early" and not early_named:
            continue
        rows += _rows(group, lives_of(group, found), fleet)
    if found and not early_named and any(row.cause == "early" for row in fleet.hazards):
        warnings.append("the removals name no early failure at all: taken as not recorded, the table's chance stays")
    rows.sort(key=lambda row: (row["engine_type"], row["cause"], row["module"], row["run"]))
    few = sum(0 < row["failures"] < LEAST_FOR_SHAPE for row in rows)
    none = sum(row["failures"] == 0 for row in rows)
    if few:
        warnings.append(
            f"{few} of {len(rows)} hazards have fewer than {LEAST_FOR_SHAPE} failures: too few for a shape; it is held "
            "at the table's and only the scale is fitted"
        )
    if none:
        warnings.append(f"{none} of {len(rows)} hazards have no failure in the records: the table's figures stay")
    if any(row["best_age"] for row in rows):
        warnings.append(
            "best ages to restore count a planned restoration against an overhaul, an engine change and its days out "
            "of service; limits and inspections prevail"
        )
    return HazardTables(rows, trend_rows(fleet, found), warnings)


def _rows(group: Group, data: Lives, fleet: Fleet) -> list[Row]:
    """Return one row for each run of a group (runs that share a law share its figures)."""
    row: Row = {
        "engine_type": group.engine_type,
        "module": group.module,
        "cause": group.cause,
        "clock": group.law.clock,
        "failures": data.failures,
        "between_looks": data.between,
        "censored": data.censored,
    }
    figures = _early(group, data) if group.cause == "early" else _law(group, data, fleet)
    notes = [figures.pop("note")]
    if len(group.runs) > 1:
        notes.append("both runs together, as the table gives them one law")
    if not group.in_table:
        notes.append("not in the table hazards")
    note = "; ".join(one for one in notes if one)
    return [row | _blank() | figures | {"run": run, "note": note} for run in group.runs]


def _blank() -> Row:
    names = ("shape", "scale", "within_chance")
    blank: Row = {f"{name}{end}": None for name in names for end in ("", "_low", "_high")}
    return blank | {
        "shape_held": "no",
        "constant_chance": None,
        "fit_chance": None,
        "best_age": None,
        "best_age_saves_frac": None,
    }


def _early(group: Group, data: Lives) -> Row:
    try:
        found = early_chance(data, within=float(group.law.ends_after_cycles or 150))
    except NoSolutionError as error:
        return {"note": str(error)}
    note = f"{found.followed} builds followed"
    if found.failures < LEAST_FOR_SHAPE:
        note += "; few failures"
    return {
        "failures": found.failures,
        "within_chance": found.chance,
        "within_chance_low": found.low,
        "within_chance_high": found.high,
        "note": note,
    }


def fitted(group: Group, data: Lives) -> tuple[Fit | None, str]:
    """Return the fit that the number of failures allows, and a plain word on it (None: nothing was at risk)."""
    if data.failures >= LEAST_FOR_SHAPE:
        try:
            fit = weibull(data)
        except NoSolutionError as error:
            return held_shape(data, shape=group.law.shape), f"{error.why}: the table's shape is held"
        return fit, f"{data.failures} failures: the shape is rough" if data.failures < FEW else ""
    try:
        fit = held_shape(data, shape=group.law.shape)
    except NoSolutionError:
        return None, "nothing was at risk in the records"
    if data.failures == 0:
        return fit, "no failure: the records only say that the life is longer than the lower end"
    some = f"{data.failures} failures are" if data.failures > 1 else "1 failure is"
    return fit, f"{some} too few for a shape: the table's {group.law.shape:g} is held"


def _law(group: Group, data: Lives, fleet: Fleet) -> Row:
    fit, note = fitted(group, data)
    if fit is None:
        return {"note": note}
    notes = [note] if note else []
    test = goodness(data, fit)
    if test is not None and test.chance < SURE:
        notes.append("the ages do not follow the law: mixed causes or parts?")
    row: Row = {
        "shape": fit.shape,
        "shape_low": fit.shape_low,
        "shape_high": fit.shape_high,
        "scale": fit.scale,
        "scale_low": fit.scale_low,
        "scale_high": fit.scale_high,
        "shape_held": "yes" if fit.held else "no",
        "constant_chance": None if fit.held else constant_hazard_chance(data, fit),
        "fit_chance": None if test is None else test.chance,
    }
    return row | _replacement(group, fit, fleet) | {"note": "; ".join(notes)}


def _replacement(group: Group, fit: Fit, fleet: Fleet) -> Row:
    """Return the best age for a planned restoration where the hazard rises, from the fleet's own prices."""
    costs = replacement_costs(fleet, group.engine_type, group.module)
    if costs is None or fit.scale is None or fit.shape <= 1.0:
        return {}
    best = best_age(shape=fit.shape, scale=fit.scale, planned_cost=costs[0], failed_cost=costs[1])
    if best.age is None:
        return {}
    return {"best_age": best.age, "best_age_saves_frac": 1.0 - best.cost_rate / best.waiting_cost_rate}


def replacement_costs(fleet: Fleet, engine_type: str, module: str) -> tuple[float, float] | None:
    """Return what a planned restoration and a failure cost, in USD: restoration; overhaul, engine change, days out."""
    levels = {row.level: row.cost_usd for row in fleet.work if (row.engine_type, row.module) == (engine_type, module)}
    kind = next((row for row in fleet.engine_types if row.engine_type == engine_type), None)
    if kind is None or not levels.get("restoration") or "overhaul" not in levels:
        return None
    change = kind.engine_change_usd + kind.engine_change_days * kind.out_of_service_usd_per_day
    return levels["restoration"], levels["overhaul"] + change


class _FleetHours:
    """Engine hours that a type has flown by a date: each tail at its present use since it was new."""

    def __init__(self, fleet: Fleet, engine_type: str) -> None:
        flown = [row for row in fleet.aircraft if row.engine_type == engine_type and row.hours_since_new > 0.0]
        self._rate = np.array([row.positions * row.hours_per_year / DAYS_PER_YEAR for row in flown])
        self._start = np.array([-row.hours_since_new / row.hours_per_year * DAYS_PER_YEAR for row in flown])

    def by(self, day: float) -> float:
        return float((self._rate * np.maximum(0.0, day - self._start)).sum())


def trend_rows(fleet: Fleet, found: list[Stretch]) -> list[Row]:
    """Return whether failures of each type and cause come more or less often per hour that the fleet flies."""
    as_of = fleet.settings.as_of
    dates: dict[tuple[str, str], list[dt.date]] = defaultdict(list)
    begin: dict[str, dt.date] = {}
    for one in found:
        if one.removed is not None:
            begin[one.engine_type] = min(begin.get(one.engine_type, one.removed), one.removed)
            if one.failed:
                dates[one.engine_type, one.cause].append(one.removed)
    rows = []
    for (kind, cause), days in sorted(dates.items()):
        flown = _FleetHours(fleet, kind)
        start = flown.by(float((begin[kind] - as_of).days))
        # where the records begin is itself a removal: it starts the clock and is not counted
        times = [flown.by(float((day - as_of).days)) - start for day in days if day > begin[kind]]
        end = flown.by(0.0) - start
        if len(times) < LEAST_FAILURES or end <= 0.0 or min(times) <= 0.0:
            continue
        rows.append(_trend_row(kind, cause, begin[kind], times, end))
    return rows


def _trend_row(kind: str, cause: str, begin: dt.date, times: list[float], end: float) -> Row:
    trend = power_law(times, end=end)
    verdict = "no trend to be seen"
    if trend.no_trend_chance < SURE:
        verdict = "more and more often per hour flown" if trend.shape > 1.0 else "less and less often per hour flown"
    return {
        "engine_type": kind,
        "cause": cause,
        "failures": trend.failures,
        "from_date": begin,
        "shape": trend.shape,
        "shape_low": trend.shape_low,
        "shape_high": trend.shape_high,
        "hours_between": trend.mean_between,
        "hours_between_low": trend.mean_between_low,
        "hours_between_high": trend.mean_between_high,
        "no_trend_chance": trend.no_trend_chance,
        "verdict": verdict,
    }
