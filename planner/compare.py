"""Which way of working is cheaper, by how much, on which basis, and do the runs suffice: a study as an answer."""

from __future__ import annotations

from itertools import combinations
from typing import Any, NamedTuple

import numpy as np

from planner.job import REASONS, RunRow
from planner.ledger import calendar_years
from planner.sequential import cheaper_chance, luck_saved, percentiles
from planner.study import Study
from sim.pricing import LINES, VALUE_LINES
from sim.removal import CAUSES

Rows = list[dict[str, Any]]
BASIS = "consumption"


class Comparison(NamedTuple):
    """The answer: tables as lists of rows whose keys are schema columns, the sentences, and what was assumed."""

    strategies: Rows
    differences: Rows
    costs: Rows
    sweep: Rows
    downtime: Rows
    removals: Rows
    cash_by_year: Rows
    difference_samples: Rows
    sentences: tuple[str, ...]
    warnings: tuple[str, ...]
    runs: int
    stopped: str

    def as_result(self) -> dict[str, Any]:
        """Return the object that ``--json`` prints as ``result``."""
        return self._asdict()


def comparison(study: Study) -> Comparison:
    """Return a study's answer. A study with no finished run gives empty tables and says so."""
    names = tuple(study.rows)
    if study.runs == 0:
        return Comparison([], [], [], [], [], [], [], [], ("No run was finished.",), (), 0, study.verdict.reason)
    pairs = tuple(combinations(names, 2))
    sweep, sweep_warnings = _sweep(study)
    return Comparison(
        strategies=[_strategy(name, study.rows[name]) for name in names],
        differences=[_difference(a, b, study) for a, b in pairs],
        costs=[row for name in names for row in _costs(name, study)],
        sweep=sweep,
        downtime=[row for name in names for row in _downtime(name, study.rows[name])],
        removals=[row for name in names for row in _removals(name, study)],
        cash_by_year=[row for name in names for row in _cash(name, study)],
        difference_samples=[row for a, b in pairs for row in _samples(a, b, study)],
        sentences=tuple(_sentences(study, pairs)),
        warnings=(*_assumptions(study), *sweep_warnings),
        runs=study.runs,
        stopped=study.verdict.reason,
    )


def _totals(rows: list[RunRow]) -> np.ndarray[Any, np.dtype[np.float64]]:
    return np.array([row.total_usd for row in rows])


def _mean(rows: list[RunRow], field: str) -> float:
    return float(np.mean([getattr(row, field) for row in rows]))


def _strategy(name: str, rows: list[RunRow]) -> dict[str, Any]:
    total = _totals(rows)
    spread = percentiles(total)
    hours, cycles = _mean(rows, "hours"), _mean(rows, "cycles")
    planned = _mean(rows, "planned_hours")
    mean = float(total.mean())
    return {
        "strategy": name,
        "runs": len(rows),
        "total_usd_mean": mean,
        "total_usd_p10": spread.p10,
        "total_usd_p50": spread.p50,
        "total_usd_p90": spread.p90,
        "cash_usd_mean": _mean(rows, "cash_usd"),
        "usd_per_engine_hour_mean": mean / hours if hours else None,
        "usd_per_planned_hour_mean": mean / planned if planned else None,
        "usd_per_cycle_mean": mean / cycles if cycles else None,
        "aircraft_days_lost_mean": float(np.mean([row.days_lost.sum() for row in rows])),
        "removals_mean": float(np.mean([row.removals.sum() for row in rows])),
        "exchanges_mean": _mean(rows, "exchanges"),
        "time_on_wing_hours_mean": _mean(rows, "on_wing_hours"),
        "shortages_mean": _mean(rows, "shortages"),
        "leased_in_mean": _mean(rows, "leased_in"),
        "stub_cycles_mean": _mean(rows, "stub_cycles"),
        "parts_replaced_mean": _mean(rows, "parts_replaced"),
        "fuel_kg_mean": _mean(rows, "fuel_kg"),
        "co2_kg_mean": _mean(rows, "co2_kg"),
    }


def _difference(a: str, b: str, study: Study) -> dict[str, Any]:
    interval = study.verdict.pairs.get((a, b))
    total_a, total_b = _totals(study.rows[a]), _totals(study.rows[b])
    return {
        "a": a,
        "b": b,
        "total_usd_mean": float((total_a - total_b).mean()),
        "total_usd_low": interval.low if interval else None,
        "total_usd_high": interval.high if interval else None,
        "cheaper_chance": cheaper_chance(total_a, total_b),
        "luck_saved": luck_saved(total_a, total_b) if study.runs > 1 else None,
    }


def _years(study: Study) -> tuple[int, ...]:
    scenario = next(iter(study.scenarios.values()))
    return calendar_years(scenario.fleet.settings, scenario.horizon_days)


def _costs(name: str, study: Study) -> Rows:
    scenario = study.scenarios[name]
    kinds = [t.engine_type for t in scenario.fleet.engine_types]
    mean = np.mean([row.costs for row in study.rows[name]], axis=0)
    return [
        {"strategy": name, "engine_type": kinds[t], "year": year, "line": LINES[k], "usd_mean": float(mean[y, t, k])}
        for y, year in enumerate(_years(study))
        for t in range(len(kinds))
        for k in range(len(LINES))
        if mean[y, t, k]
    ]


def _downtime(name: str, rows: list[RunRow]) -> Rows:
    mean = np.mean([row.days_lost for row in rows], axis=0)
    return [
        {"strategy": name, "reason": reason, "aircraft_days_mean": float(mean[i])} for i, reason in enumerate(REASONS)
    ]


def _removals(name: str, study: Study) -> Rows:
    kinds = [t.engine_type for t in study.scenarios[name].fleet.engine_types]
    mean = np.mean([row.removals for row in study.rows[name]], axis=0)
    return [
        {"strategy": name, "engine_type": kind, "cause": cause, "removals_mean": float(mean[t, c])}
        for t, kind in enumerate(kinds)
        for c, cause in enumerate(CAUSES)
        if mean[t, c]
    ]


def _cash(name: str, study: Study) -> Rows:
    cash = [k for k, line in enumerate(LINES) if line not in VALUE_LINES]
    mean = np.mean([row.costs[:, :, cash].sum(axis=(1, 2)) for row in study.rows[name]], axis=0)
    return [{"strategy": name, "year": year, "usd_mean": float(mean[y])} for y, year in enumerate(_years(study))]


def _samples(a: str, b: str, study: Study) -> Rows:
    difference = _totals(study.rows[a]) - _totals(study.rows[b])
    return [{"a": a, "b": b, "run": run, "total_usd": float(value)} for run, value in enumerate(difference)]


def _sweep(study: Study) -> tuple[Rows, list[str]]:
    """Return the cheapest strategy at each horizon on both bases, and a warning where they differ."""
    rows: Rows = []
    warnings = []
    means = {name: np.mean([row.sweep for row in runs], axis=0) for name, runs in study.rows.items()}
    for number, years in enumerate(study.sweep_years):
        winners = []
        for column, basis in enumerate((BASIS, "cash")):
            best = min((float(mean[number, column]), name) for name, mean in means.items())[1]
            winners.append(best)
            rows += [
                {
                    "horizon_years": years,
                    "basis": basis,
                    "cheapest": best,
                    "strategy": name,
                    "usd_mean": float(mean[number, column]),
                }
                for name, mean in means.items()
            ]
        if winners[0] != winners[1]:
            warnings.append(
                f"at {years:g} years the two bases name different winners: {winners[0]} on consumption, {winners[1]} "
                "on cash alone, which leaves out the life used up or bought"
            )
    return rows, warnings


def _sentences(study: Study, pairs: tuple[tuple[str, str], ...]) -> list[str]:
    """Say for each pair which is better, by how much, on which basis, and whether the runs suffice."""
    result = []
    for a, b in pairs:
        interval = study.verdict.pairs.get((a, b))
        if interval is None:
            continue
        better, worse = (a, b) if interval.mean <= 0 else (b, a)
        low, high = sorted((abs(interval.low), abs(interval.high)))
        share = abs(interval.mean) / max(1.0, float(_totals(study.rows[worse]).mean()))
        span = f"95 % interval {interval.low / 1e6:+.2f} to {interval.high / 1e6:+.2f} M USD"
        if interval.low <= 0.0 <= interval.high:
            result.append(
                f"{a} and {b} cannot be told apart with {study.runs} runs: the difference is "
                f"{interval.mean / 1e6:+.2f} M USD, {span} (present value, consumption basis); ask for more runs or a "
                "finer precision."
            )
        else:
            result.append(
                f"{better} costs less than {worse}: {abs(interval.mean) / 1e6:.2f} M USD ({share:.1%}) in present "
                f"value on the consumption basis, 95 % interval {low / 1e6:.2f} to {high / 1e6:.2f} M USD; the "
                f"{study.runs} runs suffice for the sign."
            )
    return result


def _assumptions(study: Study) -> list[str]:
    scenario = next(iter(study.scenarios.values()))
    settings = scenario.fleet.settings
    years = scenario.horizon_days / 365.25
    found = [
        f"{years:g} years from {settings.as_of.isoformat()}, discounted at {settings.discount_rate_frac:.1%} a year, "
        f"prices of {(settings.price_date or settings.as_of).isoformat()} escalated by index",
        "stock: the same money in spares for each strategy"
        if study.request.same_money
        else "stock: as held today (or as asked), the same for each strategy"
        if not study.request.stock_of
        else "stock: as asked for each strategy",
    ]
    if study.runs < 40:
        found.append(f"percentiles need 40 runs; {study.runs} were made")
    return [*found, *scenario.fleet.assumptions]
