"""What made an engine's margin jump, as rows: visits, washes and swaps in the records, and steps not in them."""

from __future__ import annotations

import datetime as dt
import math
from collections.abc import Callable
from typing import Any

from planner.fit_margin import GAIN, Z95, MarginFit
from planner.fit_margin_pool import Pooled
from planner.fit_margin_records import Group
from planner.fit_margin_steps import sized

Row = dict[str, Any]
DateOf = Callable[[float], dt.date]

NOT_TOLD = "not in the records"


def event_rows(group: Group, pooled: Pooled, date_of: DateOf) -> list[Row]:
    """Return the jumps of every engine of a group, in order of engine and date."""
    rows: list[Row] = []
    for number, fit in enumerate(pooled.fits):
        before = pooled.fits[number - 1] if number else None
        if before is not None and before.stretch.engine_serial == fit.stretch.engine_serial:
            rows.append(_visit(before, fit, date_of))
        rows += _washes(fit, date_of) if number not in group.washed_by_plan else []
        rows += _steps(fit, date_of)
    return sorted(rows, key=lambda row: (row["engine_serial"], row["to_date"]))


def _row(fit: MarginFit, first: dt.date, last: dt.date, values: tuple[float, float, float], why: str) -> Row:
    size, low, high = values
    return {
        "engine_serial": fit.stretch.engine_serial,
        "from_date": first,
        "to_date": last,
        "size_degC": size,
        "low": low,
        "high": high,
        "explained": why,
    }


def _visit(before: MarginFit, after: MarginFit, date_of: DateOf) -> Row:
    """Return what a visit gave: the margin at the first reading after it less that at the last before it."""
    last, first = before.stretch.cycles[-1], after.stretch.cycles[0]
    (old,), (old_spread,) = before.at(last)
    (new,), (new_spread,) = after.at(first)
    half = Z95 * math.hypot(old_spread, new_spread)
    size = float(new - old)
    days = date_of(float(before.stretch.days[-1])), date_of(float(after.stretch.days[0]))
    return _row(after, *days, (size, size - half, size + half), "visit")


def _washes(fit: MarginFit, date_of: DateOf) -> list[Row]:
    """Return the washes that readings mark, each with the engine's gain just after a wash."""
    stretch, gain = fit.stretch, fit.interval(GAIN)
    rows = []
    for cycles in stretch.washes:
        after = int(abs(stretch.cycles - cycles).argmin())
        days = date_of(float(stretch.days[max(0, after - 1)])), date_of(float(stretch.days[after]))
        rows.append(_row(fit, *days, gain, "wash"))
    return rows


def _steps(fit: MarginFit, date_of: DateOf) -> list[Row]:
    rows = []
    for step in sized(fit):
        why = "swap or change of rating"
        if not step.recorded:
            guess = "wash, swap or reading" if step.size_degC > 0.0 else "damage or reading"
            why = f"{NOT_TOLD}: {guess}?"
        values = (step.size_degC, step.low_degC, step.high_degC)
        rows.append(_row(fit, date_of(step.from_day), date_of(step.to_day), values, why))
    return rows
