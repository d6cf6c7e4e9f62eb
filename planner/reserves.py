"""Reserve accounts of leases: paid by hour and cycle, drawn on qualifying visits, the balance a claim at the end.

A draw is the least of the balance on the day and the cost that qualifies: an account for ``engine`` pays any work of
the engine's visits, one for ``parts`` the parts, one with a module's name that module's restorations (common
practice, no source). Balances are sequential, so this is a short loop over visits, in order of day.
"""

from __future__ import annotations

import math

import numpy as np

from planner.ledger import Ledger, Priced
from sim.events import KIND, Log
from sim.fleet import ReserveAccount
from sim.pricing import LINES
from sim.spec import Setup

_FLOWN, _COST = KIND["flown"], KIND["cost"]
_PAID, _DRAWN, _START, _END = (LINES.index(k) for k in ("reserves_paid", "reserves_drawn", "life_start", "life_end"))


class Reserves:
    """The reserve accounts of one setup."""

    def __init__(self, setup: Setup) -> None:
        self._setup = setup
        tails = {lease.lease: lease.tail for lease in setup.fleet.leases}
        self._accounts: dict[str, list[ReserveAccount]] = {}
        for account in setup.fleet.reserve_accounts:
            if tails.get(account.lease):
                self._accounts.setdefault(tails[account.lease], []).append(account)
        # an account follows the engines that the lease came with
        self._home = {e.engine_serial: e.tail for e in setup.fleet.engines if e.tail in self._accounts}
        self._end = {lease.tail: lease.return_day for lease in setup.fleet.leases if lease.after_return != "extend"}
        self._rate = math.log1p(setup.fleet.settings.discount_rate_frac) / 365.25

    def priced(self, log: Log, ledger: Ledger, end: float) -> Priced:
        """Return the present cost of the accounts up to a day: paid in, drawn, and the change of the balances."""
        costs = np.zeros((len(ledger.years), len(self._setup.types), len(LINES)))
        if not self._accounts:
            return Priced(costs, 0.0, 0.0)
        flown: dict[str, list[tuple[float, float, float, int]]] = {}
        visits: dict[str, list[tuple[float, int, float]]] = {}
        for row in log.rows:
            if row[0] == _FLOWN and row[7] in self._accounts:
                flown.setdefault(row[7], []).append((row[1], row[2], row[10], row[9]))
            elif row[0] == _COST and row[7] in self._home and row[3] <= end:
                visits.setdefault(self._home[row[7]], []).append((row[1], row[4], row[5]))
        for tail, accounts in self._accounts.items():
            kind = next(a.engine_type for a in self._setup.fleet.aircraft if a.tail == tail)
            number = list(self._setup.types).index(kind)
            for account in accounts:
                last = min(end, self._end.get(tail, math.inf))
                self._one(costs[:, number], account, flown.get(tail, []), visits.get(tail, []), ledger, last)
        by_line = costs.sum(axis=(0, 1))
        return Priced(costs, float(by_line.sum()), float(by_line[_PAID] + by_line[_DRAWN]))

    def _one(
        self,
        costs: np.ndarray[tuple[int, int], np.dtype[np.float64]],
        account: ReserveAccount,
        flown: list[tuple[float, float, float, int]],
        visits: list[tuple[float, int, float]],
        ledger: Ledger,
        end: float,
    ) -> None:
        moves = []
        for since, until, hours, cycles in flown:
            share = 1.0 if until <= end else max(0.0, (end - since) / (until - since))
            day = (since + min(until, end)) / 2.0
            grown = (1.0 + account.escalation_frac) ** (day / 365.25)
            usd = (hours * account.usd_per_hour + cycles * account.usd_per_cycle) * share * grown
            if usd:
                moves.append((day, 1, usd))
        for day, item, amount in visits:
            if day <= end and self._qualifies(account.event, item):
                moves.append((day, 2, amount * ledger.unit_price(item, day)))
        balance = account.balance_usd
        costs[0, _START] += balance
        for day, what, usd in sorted(moves):
            year, worth = ledger.year_of(day), math.exp(-self._rate * day)
            if what == 1:
                balance += usd
                costs[year, _PAID] += usd * worth
            else:
                drawn = min(balance, max(0.0, usd))
                balance -= drawn
                costs[year, _DRAWN] -= drawn * worth
        costs[ledger.year_of(end), _END] -= balance * math.exp(-self._rate * end)

    def _qualifies(self, event: str, item: int) -> bool:
        key = self._setup.catalogue.items[item].key
        if key[0] == "part":
            return event in ("parts", "engine")
        if key[0] in ("work", "findings"):
            return (event == "engine" or event == key[2]) and key[3] != "check"
        return False
