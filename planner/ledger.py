"""Money after events: every row that a run left is priced, escalated by index and discounted by its day.

Present cost of a point row: amount x price x escalation(day) x (1 + rate) ** (-days / 365.25). A span is spread evenly
over its days, split at calendar years, and discounted by the mean factor of each piece. The lines add up to the total
by year and engine type. An unpriced event is an error, never a zero. numpy only: this runs inside a worker.
"""

from __future__ import annotations

import datetime as dt
import math
from bisect import bisect_right
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sim.errors import UnpricedError
from sim.events import KIND, Log
from sim.fleet import Settings
from sim.pricing import LINES, VALUE_LINES
from sim.spec import Setup

Floats = NDArray[np.float64]
_VALUE = KIND["value"]
_IS_VALUE = np.array([line in VALUE_LINES for line in LINES])


class Priced(NamedTuple):
    """Present cost in USD: ``costs`` of shape (years, engine types, lines), ``total`` on the consumption basis,
    ``cash``
    alone."""

    costs: Floats
    total: float
    cash: float


def calendar_years(settings: Settings, horizon_days: float) -> tuple[int, ...]:
    """Return the calendar years that a horizon touches."""
    last = settings.as_of + dt.timedelta(days=math.ceil(horizon_days) - 1)
    return tuple(range(settings.as_of.year, last.year + 1))


class Ledger:
    """Prices the logs of one setup; made once, used for every run."""

    def __init__(self, setup: Setup) -> None:
        self._setup = setup
        settings = setup.fleet.settings
        self.years = calendar_years(settings, setup.horizon_days)
        starts = [float((dt.date(year, 1, 1) - settings.as_of).days) for year in self.years]
        self._year_starts = np.array([0.0, *starts[1:]])
        self._rate = math.log1p(settings.discount_rate_frac) / 365.25
        self._types = {name: i for i, name in enumerate(setup.types)}
        self._indices = _index_steps(setup)
        self._starts = self._year_starts.tolist()
        self._all_steps = sorted({day for _, _, steps in self._indices for day in steps.tolist()})
        self._unit_prices: dict[tuple[int, int], float] = {}
        self._read_catalogue()

    def _read_catalogue(self) -> None:
        items = self._setup.catalogue.items
        names = [name for name, _, _ in self._indices]
        self._count = len(items)
        self._price = np.array([item.price_usd for item in items])
        self._line = np.array([LINES.index(item.line) for item in items])
        self._type = np.array([self._types.get(item.engine_type, 0) for item in items])
        self._unit_prices.clear()
        self._shares = np.zeros((len(items), len(names) + 1))
        for i, item in enumerate(items):
            known = [(names.index(index), share) for index, share in item.shares if index in names]
            for number, share in known:
                self._shares[i, number] = share
            self._shares[i, -1] = 1.0 - sum(share for _, share in known)

    def price(self, log: Log, horizon_days: float | None = None) -> Priced:
        """Return the present cost of a run up to a horizon (the study's own when None).

        Raises UnpricedError naming every item that happened and has no price.
        """
        end = self._setup.horizon_days if horizon_days is None else horizon_days
        self.refresh()
        return self.price_columns(self.columns(log), end)

    def refresh(self) -> None:
        """Read the catalogue again if a run has asked for items that it did not hold."""
        if len(self._setup.catalogue.items) != self._count:
            self._read_catalogue()

    def unit_price(self, item: int, day: float) -> float:
        """Return the escalated price in USD of one unit on a day, not discounted."""
        lists = bisect_right(self._all_steps, day)
        found = self._unit_prices.get((item, lists))
        if found is None:
            found = float(self._price[item] * self._escalation(np.array([item]), np.array([day]))[0])
            self._unit_prices[item, lists] = found
        return found

    def year_of(self, day: float) -> int:
        """Return the number of the calendar year of a day."""
        return min(max(0, bisect_right(self._starts, day) - 1), len(self.years) - 1)

    @staticmethod
    def columns(log: Log) -> tuple[Floats, NDArray[np.int64]]:
        """Return the priced rows as arrays: (day, until, booked, amount) of shape (4, n), and (kind, item)."""
        rows = [row for row in log.rows if row[4] >= 0]
        if not rows:
            return np.zeros((4, 0)), np.zeros((2, 0), dtype=np.int64)
        kind, day, until, booked, item, amount = zip(*[row[:6] for row in rows], strict=True)
        return np.array([day, until, booked, amount]), np.array([kind, item])

    def price_columns(self, columns: tuple[Floats, NDArray[np.int64]], end: float) -> Priced:
        (day, until, booked, amount), (kind, item) = columns
        held = booked <= end
        is_value = kind == _VALUE
        held &= ~is_value | (day == 0.0) | (day == end)
        self._refuse_unpriced(item[held])
        costs = np.zeros((len(self.years), len(self._types), len(LINES)))
        self._points(costs, held & (until <= day), day, amount, item)
        self._spans(costs, held & (until > day), day, until, amount, item, end)
        by_line = costs.sum(axis=(0, 1))
        return Priced(costs, float(by_line.sum()), float(by_line[~_IS_VALUE].sum()))

    def _refuse_unpriced(self, item: NDArray[np.int64]) -> None:
        bad = np.unique(item[~np.isfinite(self._price[item])])
        if len(bad):
            raise UnpricedError(tuple(" ".join(self._setup.catalogue.items[i].key) for i in bad))

    def _escalation(self, item: NDArray[np.int64], day: Floats) -> Floats:
        """Return the factor on each item's price on each day."""
        factors = np.ones((len(day), len(self._indices) + 1))
        for i, (_, growth, steps) in enumerate(self._indices):
            factors[:, i] = (1.0 + growth) ** np.searchsorted(steps, day, side="right")
        result: Floats = (factors * self._shares[item]).sum(axis=1)
        return result

    def _year(self, day: Floats) -> NDArray[np.int64]:
        return np.clip(np.searchsorted(self._year_starts, day, side="right") - 1, 0, len(self.years) - 1)

    def _points(
        self, costs: Floats, which: NDArray[np.bool_], day: Floats, amount: Floats, item: NDArray[np.int64]
    ) -> None:
        day, amount, item = day[which], amount[which], item[which]
        usd = amount * self._price[item] * self._escalation(item, day) * np.exp(-self._rate * day)
        np.add.at(costs, (self._year(day), self._type[item], self._line[item]), usd)

    def _spans(
        self,
        costs: Floats,
        which: NDArray[np.bool_],
        day: Floats,
        until: Floats,
        amount: Floats,
        item: NDArray[np.int64],
        end: float,
    ) -> None:
        day, until, amount, item = day[which], until[which], amount[which], item[which]
        for number, start in enumerate(self._year_starts):
            last = self._year_starts[number + 1] if number + 1 < len(self._year_starts) else math.inf
            low = np.maximum(day, start)
            high = np.minimum(np.minimum(until, last), end)
            inside = high > low
            if not inside.any():
                continue
            a, b, its = low[inside], high[inside], item[inside]
            share = (b - a) / (until[inside] - day[inside])
            usd = amount[inside] * share * self._price[its] * self._escalation(its, a) * self._mean_discount(a, b)
            np.add.at(costs, (number, self._type[its], self._line[its]), usd)

    def _mean_discount(self, low: Floats, high: Floats) -> Floats:
        if self._rate == 0.0:
            return np.ones_like(low)
        result: Floats = np.exp(-self._rate * low) * -np.expm1(-self._rate * (high - low)) / (self._rate * (high - low))
        return result


def _index_steps(setup: Setup) -> list[tuple[str, float, Floats]]:
    """Return each index with its growth and the days (from the as-of date) on which a new list comes after the price
    date."""
    settings = setup.fleet.settings
    first = settings.price_date or settings.as_of
    found = []
    for index in setup.fleet.indices:
        years = range(first.year, settings.as_of.year + int(setup.horizon_days / 365.25) + 3)
        dates = [dt.date(year, index.step_month, 1) for year in years]
        steps = [float((date - settings.as_of).days) for date in dates if date > first]
        found.append((index.index, index.per_year_frac, np.array(steps)))
    return found
