"""The answer on lease returns as tables: conditions, settlements, cures."""

from __future__ import annotations

import datetime as dt
import math
from collections import Counter
from typing import Any

import numpy as np

from planner.lease import LeaseAnswer, ReturnOf
from planner.lease_terms import UNITS, wanted_text
from planner.settlement import reserve_balance

Row = dict[str, Any]
_PERCENTILES_FROM = 40  # fewer runs carry no percentiles


def conditions(answer: LeaseAnswer) -> list[Row]:
    """Return each condition of each lease: in every run the engine and serial that come out worst."""
    rows = []
    for lease, group in _by_lease(answer).items():
        names = [one.term for one in group[0].outcomes[0].measured]
        for number, term in enumerate(names):
            values, worst, passed, usd = [], Counter[str](), 0, 0.0
            for run in range(len(group[0].outcomes)):
                found = [one.outcomes[run].measured[number] for one in group]
                least = max(found, key=lambda m: (m.short, -m.value if term.least is not None else m.value))
                values.append(least.value)
                worst[least.serial] += 1
                passed += all(m.short <= 0.0 for m in found)
                usd += sum(one.outcomes[run].short_usd.get(term.condition, 0.0) for one in group)
            count = len(values)
            # what is wanted orients the percentiles: P10 is the tenth that comes out lowest
            p10, p50, p90 = _percentiles(values)
            rows.append(
                {
                    "lease": lease,
                    "condition": term.condition,
                    "wanted": wanted_text(term),
                    "at_return_p10": p10,
                    "at_return_p50": p50,
                    "at_return_p90": p90,
                    "pass_chance": passed / count,
                    "serial": worst.most_common(1)[0][0],
                    "unit": UNITS[term.condition],
                    "remedy": term.remedy,
                    "settlement_usd": usd / count * answer.view.discount(max(0.0, group[0].lease.return_day)),
                }
            )
    return rows


def settlements(answer: LeaseAnswer) -> list[Row]:
    """Return each rule of money of each lease on average over the runs, and the reserve accounts at the return."""
    rows = []
    for lease, group in _by_lease(answer).items():
        totals: dict[tuple[str, str, str, str], list[float]] = {}
        for one in group:
            for found in one.outcomes:
                for row in found.settled:
                    # parts change on the way: their rule is told by engine, modules by serial
                    serial = one.engine.engine_serial if row.event == "parts" else row.serial
                    total = totals.setdefault((row.event, row.basis, serial, row.unit), [0.0, 0.0, 0.0])
                    total[0] += row.at_return
                    total[1] += row.usd
                    total[2] += 1
        runs = len(group[0].outcomes)
        for (event, basis, serial, unit), (value, usd, count) in totals.items():
            rows.append(
                {
                    "lease": lease,
                    "event": event,
                    "basis": basis,
                    "serial": serial,
                    "at_return": value / count,
                    "unit": unit if event != "parts" else f"{unit}, mean of its parts",
                    "usd": usd / runs,
                }
            )
        rows += _reserves(answer, group[0])
    return rows


def _reserves(answer: LeaseAnswer, one: ReturnOf) -> list[Row]:
    view, lease = answer.view, one.lease
    day, rows = max(0.0, lease.return_day), []
    use = view.uses.get(lease.tail)
    for account in view.fleet.reserve_accounts:
        if account.lease != lease.lease:
            continue
        cycles = use.cycles(day) if use else 0.0
        hours = use.hours(cycles) if use else 0.0
        daily = (hours * account.usd_per_hour + cycles * account.usd_per_cycle) / max(day, 1.0)
        balance = reserve_balance(
            account.balance_usd, usd_per_day=daily, days=day, escalation_frac=account.escalation_frac
        )
        rows.append(
            {
                "lease": lease.lease,
                "event": account.event,
                "basis": "reserves",
                "serial": lease.tail or lease.engine_serial,
                "at_return": balance,
                "unit": "USD in the account, drawn only by a qualifying visit",
                "usd": 0.0,
            }
        )
    return rows


def cures(answer: LeaseAnswer) -> list[Row]:
    """Return every way through, the cheapest first by lease and engine; ``chosen`` marks the plan for all together."""
    rows = []
    for number, one in enumerate(answer.returns):
        order = sorted(
            range(len(one.cures)),
            key=lambda c: (not one.cures[c].allowed, math.isnan(one.cures[c].cost_usd), one.cures[c].cost_usd),
        )
        for c in order:
            cure = one.cures[c]
            rows.append(
                {
                    "lease": cure.lease,
                    "cure": cure.cure,
                    "serials": " ".join((cure.engine_serial, *cure.uses)),
                    "cost_usd": None if math.isnan(cure.cost_usd) else cure.cost_usd,
                    "last_day_to_decide": _date(answer, cure.last_day),
                    "pass_chance": cure.pass_chance,
                    "lead_days": round(cure.lead_days),
                    "risk": cure.risk,
                    "chosen": bool(answer.chosen) and answer.chosen[number] == c,
                    "reason": cure.reason,
                }
            )
    return rows


def sentence(answer: LeaseAnswer) -> str:
    """Return the answer in words: how many pass as they are, what the cheapest plan does and costs."""
    if not answer.returns:
        return "No lease return lies inside the horizon."
    by_lease = _by_lease(answer)
    chances = {name: _pass_chance(group) for name, group in by_lease.items()}
    weak = [name for name, chance in chances.items() if chance < 0.9]
    base = sum(one.cures[0].cost_usd for one in answer.returns)
    saved = base - answer.cost_usd
    text = f"{len(by_lease)} return{'s' if len(by_lease) != 1 else ''}: "
    text += f"{len(weak)} pass with less than 90 % chance" + (f" ({', '.join(weak)}). " if weak else ". ")
    text += f"Flying out and paying costs {base / 1e3:,.0f} thousand USD at present value; "
    if saved > 0.5:
        text += f"the cheapest plan {answer.cost_usd / 1e3:,.0f}, {saved / 1e3:,.0f} less."
    else:
        text += "nothing that was looked at is cheaper."
    return text


def _pass_chance(group: list[ReturnOf]) -> float:
    runs = len(group[0].outcomes)
    return sum(all(one.outcomes[run].passes for one in group) for run in range(runs)) / runs


def _by_lease(answer: LeaseAnswer) -> dict[str, list[ReturnOf]]:
    found: dict[str, list[ReturnOf]] = {}
    for one in answer.returns:
        found.setdefault(one.lease.lease, []).append(one)
    return found


def _percentiles(values: list[float]) -> tuple[float | None, float | None, float | None]:
    if len(values) < _PERCENTILES_FROM:
        return None, None, None
    p10, p50, p90 = np.percentile(np.array(values), (10, 50, 90)).tolist()
    return p10, p50, p90


def _date(answer: LeaseAnswer, day: float) -> dt.date:
    """Return the date of a day; days before the as-of date are kept as they are."""
    return answer.view.fleet.settings.as_of + dt.timedelta(days=math.floor(day))
