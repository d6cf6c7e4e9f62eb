"""The year's shape: from days to flown years and back.

Use follows the months' shares. A *flown year* is a year of planned use: an aircraft with 1,900 cycles a year has flown
1,900 cycles after one flown year, however the calendar ran. Piecewise linear, strictly increasing, hence invertible.
"""

from __future__ import annotations

import datetime as dt
from bisect import bisect_right

from sim.errors import RequestError

_YEARS = 80  # knots reach this far, so that outlooks far past the horizon still have dates


class Season:
    """Maps days from the as-of date to flown years. ``shares``: twelve weights, January first."""

    __slots__ = ("_days", "_flown", "_slopes", "as_of", "year_starts")

    def __init__(self, as_of: dt.date, shares: tuple[float, ...]) -> None:
        if len(shares) != 12 or min(shares) <= 0.0:
            raise RequestError("season", str(shares), "twelve shares above zero", "mend season.csv")
        self.as_of = as_of
        lengths = (31.0, 28.25, 31.0, 30.0, 31.0, 30.0, 31.0, 31.0, 30.0, 31.0, 30.0, 31.0)
        mean = sum(share * length for share, length in zip(shares, lengths, strict=True)) / sum(lengths)
        year, month, day = as_of.year, as_of.month, as_of.day
        start = -(day - 1)
        days, flown, slopes, total = [0.0], [0.0], [], 0.0
        for _ in range(_YEARS * 12):
            following = dt.date(year + month // 12, month % 12 + 1, 1)
            end = float((following - as_of).days)
            slope = shares[month - 1] / mean / 365.25
            total += slope * (end - max(0.0, float(start)))
            days.append(end)
            flown.append(total)
            slopes.append(slope)
            start = int(end)
            year, month = following.year, following.month
        slopes.append(slopes[-1])
        self._days, self._flown, self._slopes = days, flown, slopes
        self.year_starts = tuple(float((dt.date(as_of.year + k, 1, 1) - as_of).days) for k in range(1, _YEARS))

    def flown(self, day: float) -> float:
        """Return the flown years from the as-of date to ``day`` (0 before it)."""
        if day <= 0.0:
            return 0.0
        i = bisect_right(self._days, day) - 1
        return self._flown[i] + (day - self._days[i]) * self._slopes[i]

    def day(self, flown: float) -> float:
        """Return the day on which so many flown years have passed."""
        if flown <= 0.0:
            return 0.0
        i = bisect_right(self._flown, flown) - 1
        return self._days[i] + (flown - self._flown[i]) / self._slopes[i]

    def date(self, day: float) -> dt.date:
        """Return the calendar date of a day (far days end at the calendar's last year)."""
        return self.as_of + dt.timedelta(days=min(int(day), 2_900_000 - self.as_of.toordinal()))

    def month(self, day: float) -> int:
        return self.date(day).month
