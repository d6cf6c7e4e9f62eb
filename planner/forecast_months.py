"""The removals ahead by month and by span, engines short, and shop slots needed against those that exist."""

from __future__ import annotations

import datetime as dt
import math
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.demand import Demand, away_chance, mean_days
from planner.picture import Picture
from planner.scenario import stock_held
from planner.stock.cover import sum_of_chances
from sim.spec import TypeSpec

Floats = NDArray[np.float64]
Row = dict[str, Any]
SPANS = (12, 36, 60)
ALL = "all"
_P90 = 1.2815515655446004  # standard normal quantile at 0.9


def month_date(as_of: dt.date, number: int) -> dt.date:
    """Return the first day of a month (the as-of date for the first one)."""
    if number == 0:
        return as_of
    year, month = divmod(as_of.year * 12 + as_of.month - 1 + number, 12)
    return dt.date(year, month + 1, 1)


def spares_by_month(view: Picture, demand: Demand) -> NDArray[np.int64]:
    """Return by month the spares owned, less those that fill positions for good."""
    held = stock_held(view.fleet)[demand.engine_type, "engine"]
    return np.asarray(held - demand.taken)


def months_rows(view: Picture, demand: Demand) -> list[Row]:
    """Return the rows of months_ahead of one type."""
    as_of = view.fleet.settings.as_of
    away = np.vstack([away_chance(demand, mean_days(demand)), demand.away_now])
    spares = spares_by_month(view, demand)
    removals = demand.rates.sum(axis=(2, 3))
    needed = slots_needed(view, demand)
    exist = slots_that_exist(view, demand)
    rows = []
    for month in range(demand.months):
        law = sum_of_chances(np.minimum(1.0, removals[:, month]))
        below = np.cumsum(law)
        out = sum_of_chances(away[:, month])
        short, chance = _short(out, int(spares[month]))
        rows.append(
            {
                "engine_type": demand.engine_type,
                "month": month_date(as_of, month),
                "removals": float(removals[:, month].sum()),
                "removals_p10": int(np.searchsorted(below, 0.1 + 1e-12)),
                "removals_p90": int(np.searchsorted(below, 0.9 - 1e-12)),
                "away": float(away[:, month].sum()),
                "spares": int(spares[month]),
                "short": short,
                "short_chance": chance,
                "slots_needed": float(needed[month]),
                "slots": None if math.isinf(exist[month]) else float(exist[month]),
                "removals_simulated": None,
                "short_chance_simulated": None,
            }
        )
    return rows


def _short(law: Floats, spares: int) -> tuple[float, float]:
    """Return how many engines are short on average, and the chance that any is, from the law of engines away."""
    beyond = np.arange(law.size) - spares
    short = float(np.clip(beyond, 0, None) @ law)
    return short, float(min(1.0, law[beyond > 0].sum()))


def slots_needed(view: Picture, demand: Demand) -> Floats:
    """Return the inductions that removals ask for by month: engines that go whole, after transport and queue."""
    kind = view.setup.types[demand.engine_type]
    shops = view.setup.shops[demand.engine_type]
    whole = np.where(np.isnan(demand.exchange_days), 1.0, 1.0 - demand.exchanged_frac)
    for slot, module in enumerate(kind.modules):
        if not math.isnan(demand.exchange_days[slot]) and module.place == "shop":
            whole[slot] = 1.0  # its exchange takes a slot as well
    inductions = (demand.rates.sum(axis=(0, 3)) * whole).sum(axis=1)
    ways = sum(shop.transport_days for shop in shops) / len(shops) if shops else 0.0
    return shifted(inductions, (ways + demand.shops.wait_days) / float(np.diff(demand.edges).mean()))


def shifted(values: Floats, months: float) -> Floats:
    """Return values moved later by a part of months; what moves past the end is gone."""
    whole, part = int(months), months - int(months)
    found = np.zeros_like(values)
    size = values.size
    if whole < size:
        found[whole:] += (1.0 - part) * values[: size - whole]
    if whole + 1 < size:
        found[whole + 1 :] += part * values[: size - whole - 1]
    return found


def slots_that_exist(view: Picture, demand: Demand) -> Floats:
    """Return the slots of each month: the rate of the shops, or what the slots table lists in months that it
    covers."""
    lengths = np.diff(demand.edges)
    found = demand.shops.slots_per_month * lengths * 12.0 / 365.25
    listed = [s.slot_day for s in view.fleet.slots if s.engine_type == demand.engine_type and s.state != "lost"]
    if listed:
        counts = np.histogram(listed, bins=demand.edges)[0].astype(np.float64)
        last = int(np.searchsorted(demand.edges, max(listed), side="right"))
        found[:last] = counts[:last]
    return np.asarray(found)


def cause_names(kind: TypeSpec) -> list[tuple[str, int, int]]:
    """Return (name, slot column, kind column) of every cause that the months tell apart."""
    found = [("margin and ends of lease-in", len(kind.modules), 0)]
    for slot, module in enumerate(kind.modules):
        found.append((f"planned, {module.module}", slot, 0))
        found.append((f"chance, {module.module}", slot, 1))
    return found


def cause_rows(view: Picture, demand: Demand) -> list[Row]:
    """Return the rows of month_causes of one type; causes that never come are left out."""
    kind, as_of = view.setup.types[demand.engine_type], view.fleet.settings.as_of
    total = demand.rates.sum(axis=0)
    return [
        {
            "engine_type": demand.engine_type,
            "month": month_date(as_of, month),
            "cause": name,
            "removals": float(total[month, slot, which]),
        }
        for name, slot, which in cause_names(kind)
        if total[:, slot, which].sum() > 1e-9
        for month in range(demand.months)
    ]


def span_rows(view: Picture, demand: Demand) -> list[Row]:
    """Return the rows of spans_ahead: removals by cause within 12, 36 and 60 months, with bands.

    A position's month holds one removal or none, so the variance is at most ``sum p (1 - p)``; bands are normal.
    """
    kind = view.setup.types[demand.engine_type]
    rows = []
    for months in SPANS:
        if months > demand.months:
            continue
        part = np.minimum(1.0, demand.rates[:, :months])
        whole = np.minimum(1.0, part.sum(axis=(2, 3)))
        rows.append(_span(demand.engine_type, months, ALL, whole))
        for name, slot, which in cause_names(kind):
            if part[:, :, slot, which].sum() > 1e-9:
                rows.append(_span(demand.engine_type, months, name, part[:, :, slot, which]))
    return rows


def _span(engine_type: str, months: int, cause: str, chance: Floats) -> Row:
    mean, spread = float(chance.sum()), math.sqrt(float((chance * (1.0 - chance)).sum()))
    return {
        "engine_type": engine_type,
        "months": months,
        "cause": cause,
        "removals": mean,
        "removals_p10": max(0, math.floor(mean - _P90 * spread + 0.5)),
        "removals_p90": max(0, math.ceil(mean + _P90 * spread - 0.5)),
    }
