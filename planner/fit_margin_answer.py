"""What the fitted margins say, as rows: each engine now and ahead, its steps, and what its type has in common."""

from __future__ import annotations

import datetime as dt
from typing import Any, NamedTuple

import numpy as np

from planner.fit_margin import EARLY, RATE, Z95, MarginFit, noise_of
from planner.fit_margin_ahead import band, chance_met, crossings
from planner.fit_margin_events import event_rows
from planner.fit_margin_pool import Pooled, pool
from planner.fit_margin_records import Current, Group, wear_factor
from sim.fleet import Fleet
from sim.redline import hottest_ambient

Row = dict[str, Any]

# How far ahead dates are looked for, and how far the band is drawn.
REACH_YEARS, DRAWN_MONTHS = 15.0, 30
# Readings at the end that all lie this many deviations to one side hint at a step too young to be told.
YOUNG_STEP = 2.0


class MarginTables(NamedTuple):
    """Rows of margins_fitted, margin_types, margin_steps and margin_ahead."""

    margins: list[Row]
    types: list[Row]
    steps: list[Row]
    ahead: list[Row]


def margin_tables(groups: list[Group], fleet: Fleet) -> MarginTables:
    """Return the rows of all groups."""
    tables = MarginTables([], [], [], [])
    noise = {
        row.engine_type: noise_of(
            [one for group in groups if group.engine_type == row.engine_type for one in group.stretches],
            believed=row.reading_noise_degC,
        )
        for row in fleet.engine_types
    }
    for group in groups:
        pooled = pool(group.stretches, group.belief, noise_degC=noise[group.engine_type])
        tables.types.append(_type_row(group, pooled))
        tables.steps.extend(event_rows(group, pooled, lambda day: fleet.settings.as_of + dt.timedelta(days=int(day))))
        for current in group.current:
            one = _Engine(fleet, group, pooled, current)
            tables.margins.append(one.row())
            tables.ahead.extend(one.ahead())
    tables.steps.sort(key=lambda row: (row["engine_serial"], row["to_date"]))
    tables.margins.sort(key=lambda row: (row["date_p50"] or dt.date.max, row["margin_degC"]))
    return tables


def _banded(name: str, value: float, low: float, high: float) -> Row:
    return {name: value, f"{name}_low": low, f"{name}_high": high}


def _type_row(group: Group, pooled: Pooled) -> Row:
    spread = Z95 * np.sqrt(np.diag(pooled.prior.mean_covariance))
    means = [float(value) for value in pooled.prior.mean]
    rate, early, gain = (
        _banded(name, mean, mean - half, mean + half)
        for name, mean, half in zip(
            ("rate_degC_per_1000_cycles", "early_loss_degC", "wash_gain_degC"), means, map(float, spread), strict=True
        )
    )
    return {
        "engine_type": group.engine_type,
        "rating": group.rating,
        "engines": len(group.current),
        "readings": sum(len(one.cycles) for one in group.stretches),
        **rate,
        "rate_spread_degC": float(pooled.prior.spread[0]),
        "table_rate_degC_per_1000_cycles": group.belief.rate_degC_per_1000_cycles,
        **early,
        "table_early_loss_degC": group.belief.early_degC,
        **gain,
        "noise_degC": pooled.noise_degC,
    }


class _Engine:
    """One engine's fit with what its future needs."""

    def __init__(self, fleet: Fleet, group: Group, pooled: Pooled, current: Current) -> None:
        self._fleet, self._group, self._pooled, self._current = fleet, group, pooled, current
        self._fit: MarginFit = pooled.fits[current.number]
        self._as_of = fleet.settings.as_of
        self._base = next((row for row in fleet.bases if current.aircraft and row.base == current.aircraft.base), None)

    def _date(self, day: float) -> dt.date:
        return self._as_of + dt.timedelta(days=int(day))

    def _day_of(self, cycles: float) -> float:
        assert self._current.use is not None
        return self._current.use.day(max(0.0, cycles - self._current.now_cycles))

    def row(self) -> Row:
        fit, current, stretch = self._fit, self._current, self._fit.stretch
        now = band(fit, np.array([current.now_cycles]))
        rate, low, high = (stretch.rate_factor * value for value in fit.interval(RATE))
        # what the engine's own early loss is, were all its modules restored: the share still to come is taken out again
        early = [self._full_early() * value for value in fit.interval(EARLY)]
        row: Row = {
            "engine_serial": current.engine.engine_serial,
            "engine_type": self._group.engine_type,
            "tail": current.engine.tail,
            "rating": self._group.rating,
            "readings": len(stretch.cycles),
            "outliers": fit.outliers,
            "margin_degC": float(now.margin_degC[0]),
            "margin_low_degC": float(now.low_degC[0]),
            "margin_high_degC": float(now.high_degC[0]),
            "rate_degC_per_1000_cycles": rate,
            "low": low,
            "high": high,
            **_banded("early_loss_degC", *early),
            "borrowed_frac": self._borrowed(),
            "steps": len(fit.steps),
            "removal_margin_degC": current.kind.removal_margin_degC,
        }
        return row | self._dates() | {"note": self._note()}

    def _full_early(self) -> float:
        """Return environment and derate alone, as they act on a loss that is all still to come."""
        return wear_factor(self._current.kind, self._current.aircraft, self._current.environment)

    def _borrowed(self) -> float:
        """Return the share of the rate's precision that comes from the type and not from the engine's readings."""
        own = float(self._fit.covariance[RATE, RATE])
        return min(1.0, own / float(self._pooled.prior.spread[0] ** 2))

    def _dates(self) -> Row:
        current, threshold = self._current, self._current.kind.removal_margin_degC
        names = ("date_p10", "date_p50", "date_p90")
        until = summer_end(self._as_of, self._base.hot_day_degC if self._base else ())
        if current.use is None or current.aircraft is None:
            return dict.fromkeys(names) | {"summer_until": until, "lasts_summer_chance": None}
        met = crossings(
            self._fit,
            threshold,
            now_cycles=current.now_cycles,
            reach_cycles=REACH_YEARS * current.aircraft.cycles_per_year,
            gain_floor=current.gain_floor,
        )
        flown = current.use.cycles(float((until - self._as_of).days))
        ahead = current.now_cycles + flown * np.linspace(0.0, 1.0, 40)
        chance = float(chance_met(self._fit, threshold, ahead, gain_floor=current.gain_floor)[-1])
        dates = {
            name: None if at is None else self._date(self._day_of(at)) for name, at in zip(names, met, strict=True)
        }
        return dates | {"summer_until": until, "lasts_summer_chance": 1.0 - chance}

    def _note(self) -> str:
        fit, notes = self._fit, []
        if self._current.use is None:
            notes.append("not flying: margin at its last reading")
        residuals = (fit.stretch.margin_degC - fit.at(fit.stretch.cycles)[0]) / fit.noise_degC
        tail = residuals[-2:]
        if len(residuals) > 3 and (np.abs(tail) > YOUNG_STEP).all() and tail[0] * tail[1] > 0.0:
            side = "below" if tail[0] < 0.0 else "above"
            notes.append(f"its last readings lie {side} the trend: a step or a fault of reading")
        if len(fit.stretch.cycles) < 4:
            notes.append("few readings: rate borrowed from its type")
        return "; ".join(notes)

    def ahead(self) -> list[Row]:
        """Return the readings with their fit, then the first day of each month to come."""
        fit, current = self._fit, self._current
        seen = band(fit, fit.stretch.cycles)
        rows = [
            self._ahead_row(self._date(float(day)), float(cycles), [float(part[i]) for part in seen[1:]])
            | {"reading_degC": float(fit.stretch.margin_degC[i]), "weight": float(fit.weights[i])}
            for i, (day, cycles) in enumerate(zip(fit.stretch.days, fit.stretch.cycles, strict=True))
        ]
        if current.use is None:
            return rows
        dates = [self._as_of, *_months(self._as_of, DRAWN_MONTHS)]
        cycles = np.array([current.now_cycles + current.use.cycles(float((date - self._as_of).days)) for date in dates])
        coming = band(fit, cycles, gain_floor=current.gain_floor)
        return rows + [
            self._ahead_row(date, float(cycles[i]), [float(part[i]) for part in coming[1:]])
            for i, date in enumerate(dates)
        ]

    def _ahead_row(self, date: dt.date, cycles: float, values: list[float]) -> Row:
        kind = self._current.kind
        margin, low, high = values
        return {
            "engine_serial": self._current.engine.engine_serial,
            "date": date,
            "cycles_since_install": round(self._current.first_cycles + cycles),
            "reading_degC": None,
            "margin_degC": margin,
            "low": low,
            "high": high,
            "weight": None,
            "hottest_ambient_degC": hottest_ambient(
                corner_point_degC=kind.corner_point_degC, margin_degC=margin, egt_per_ambient=kind.egt_per_ambient
            ),
            "hot_day_degC": self._base.hot_day_degC[date.month - 1] if self._base else None,
        }


def _months(start: dt.date, count: int) -> list[dt.date]:
    first = [(start.year * 12 + start.month - 1) + number for number in range(1, count + 1)]
    return [dt.date(month // 12, month % 12 + 1, 1) for month in first]


def summer_end(as_of: dt.date, hot_days: tuple[float | None, ...]) -> dt.date:
    """Return the first day after the summer that is on or comes next.

    Summer: the months whose hot day is within 3 degC of the year's hottest; June to September where a base has no hot
    days.
    """
    known = {month: hot for month, hot in enumerate(hot_days, start=1) if hot is not None}
    hot = {month for month, value in known.items() if value > max(known.values()) - 3.0} or {6, 7, 8, 9}
    if len(hot) == 12:
        return dt.date(as_of.year + 1, as_of.month, 1)
    month = as_of.year * 12 + as_of.month - 1
    while month % 12 + 1 not in hot:
        month += 1
    while month % 12 + 1 in hot:
        month += 1
    return dt.date(month // 12, month % 12 + 1, 1)


def margin_sentences(tables: MarginTables) -> list[str]:
    """Return in words what the trends say: rates against the table, and who may not last the summer."""
    sentences = []
    for row in tables.types:
        rate, table = row["rate_degC_per_1000_cycles"], row["table_rate_degC_per_1000_cycles"]
        inside = row["rate_degC_per_1000_cycles_low"] <= table <= row["rate_degC_per_1000_cycles_high"]
        sentences.append(
            f"Type {row['engine_type']} at {row['rating']}: {rate:.1f} degC lost per 1,000 cycles "
            f"({row['rate_degC_per_1000_cycles_low']:.1f} to {row['rate_degC_per_1000_cycles_high']:.1f}); the table's "
            f"{table:.1f} {'agrees' if inside else 'does not agree'}."
        )
    weak = [row for row in tables.margins if (row["lasts_summer_chance"] or 1.0) < 0.9]
    if weak:
        named = ", ".join(f"{row['engine_serial']} ({100 * row['lasts_summer_chance']:.0f} %)" for row in weak[:8])
        until = max(row["summer_until"] for row in weak).isoformat()
        sentences.append(
            f"{len(weak)} engines hold their margin through the summer ({until}) with less than 90 %: {named}"
            + (" ..." if len(weak) > 8 else ".")
        )
    return sentences
