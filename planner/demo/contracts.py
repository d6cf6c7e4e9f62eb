"""Leases of the scenario: four invented lessors, their terms, settlements, deliveries and reserve accounts."""

from __future__ import annotations

import datetime as dt

from planner.demo.luck import uniform
from planner.demo.sub_fleets import AS_OF, Tail
from planner.demo.type_tables import Row

LESSORS = ("Amber Leasing", "Birch Aero Finance", "Cobalt Engines", "Delta Quay Leasing")
_TERMS = ("A", "B", "C", "B")
_RULES = ("own_back", "own_back", "title_swap", "own_back")
_FIRST, _LAST = dt.date(2026, 12, 1), dt.date(2031, 1, 31)
# by type: least cycles on every part, most hours since restoration, least margin, least cycles to the next removal
_CONDITIONS = {
    ("A", "N"): (4000, 7000, 15, None),
    ("A", "W"): (1500, 10000, 15, None),
    ("B", "N"): (3500, None, 12, 2500),
    ("B", "W"): (1200, None, 10, 1200),
    ("C", "N"): (2000, 9000, 8, None),
    ("C", "W"): (600, 12000, 8, None),
}
_RESERVES_USD_PER_HOUR = {"N": 330, "W": 450}
_HPT_RESTORATION = {"N": (1_500_000, 7500), "W": (2_900_000, 2900)}
_PART_USD_PER_CYCLE = {"N": 25.0, "W": 90.0}


def leased(tails: list[Tail]) -> list[Tail]:
    """Return every other tail: about half of the fleet is leased."""
    return [tail for number, tail in enumerate(tails) if number % 2 == 0 and tail.entry <= AS_OF]


def lease_tables(tails: list[Tail], seed: int, *, plain: bool) -> dict[str, list[Row]]:
    """Return leases, terms, settlements and accounts; in a plain fleet no lease returns within the first two years."""
    first = dt.date(2028, 9, 1) if plain else _FIRST
    leases, accounts = [], []
    chosen = leased(tails)
    for number, tail in enumerate(chosen):
        lessor = number % 4
        share = (number + 0.5) / len(chosen)
        jitter = (uniform(seed, "return", tail.tail) - 0.5) / len(chosen)
        day = first + dt.timedelta(days=round((_LAST - first).days * min(1.0, max(0.0, share + jitter))))
        name = f"L-{tail.tail}"
        follow = uniform(seed, "after", tail.tail)
        leases.append(
            {
                "lease": name,
                "tail": tail.tail,
                "owner": LESSORS[lessor],
                "return_date": day.isoformat(),
                "terms": _TERMS[lessor],
                "exchange_rule": _RULES[lessor],
                "approval_days": 30 if _RULES[lessor] == "title_swap" else 45,
                "after_return": "extend" if follow < 0.6 else "replace" if follow < 0.9 else "leave",
                "extend_years": 6,
            }
        )
        if lessor in (0, 2):
            rate = _RESERVES_USD_PER_HOUR[tail.sub_fleet.engine_type]
            balance = round(rate * 2 * tail.sub_fleet.hours * (0.5 + uniform(seed, "balance", tail.tail)), -3)
            accounts.append(
                {
                    "lease": name,
                    "event": "engine",
                    "balance_usd": balance,
                    "usd_per_hour": rate,
                    "escalation_frac": 0.04,
                }
            )
    kinds = sorted({tail.sub_fleet.engine_type for tail in tails})
    return {
        "leases": leases,
        "lease_terms": [row for terms in "ABC" for kind in kinds for row in _terms(terms, kind)],
        "lease_settlements": [row for terms in "ABC" for kind in kinds for row in _settlements(terms, kind)],
        "reserve_accounts": accounts,
    }


def _terms(terms: str, kind: str) -> list[Row]:
    cycles, hours, margin, ahead = _CONDITIONS[terms, kind]
    base = {"terms": terms, "engine_type": kind}
    short = (
        {"remedy": "pay_short", "usd_per_unit_short": _PART_USD_PER_CYCLE[kind]} if terms == "B" else {"remedy": "hard"}
    )
    rows = [{"condition": "part_cycles", "per": "part", "least": cycles} | short]
    if hours is not None:
        rows.append({"condition": "hours_since_restoration", "per": "engine", "most": hours, "remedy": "hard"})
    rows.append({"condition": "margin", "per": "engine", "least": margin, "remedy": "hard"})
    if ahead is not None:
        rows.append({"condition": "cycles_to_removal", "per": "engine", "least": ahead, "remedy": "hard"})
    rows.append({"condition": "own_serials", "per": "engine", "remedy": "hard"})
    return [base | row for row in rows]


def _settlements(terms: str, kind: str) -> list[Row]:
    base = {"terms": terms, "engine_type": kind}
    usd, interval = _HPT_RESTORATION[kind]
    if terms == "A":
        return [
            base
            | {
                "event": "HPT",
                "basis": "half_life",
                "expected_interval": interval,
                "clock": "cycles",
                "event_cost_usd": usd,
                "escalation_frac": 0.04,
            }
        ]
    if terms == "B":
        return [
            base | {"event": "HPT", "basis": "mirror_one_way", "clock": "cycles", "rate_usd": round(usd / interval, 2)}
        ]
    return [
        base
        | {
            "event": "HPT",
            "basis": "full_life",
            "expected_interval": interval,
            "clock": "cycles",
            "event_cost_usd": usd,
            "escalation_frac": 0.04,
        }
    ]


def owners(tails: list[Tail]) -> dict[str, str]:
    """Return the owner of each leased tail."""
    return {tail.tail: LESSORS[number % 4] for number, tail in enumerate(leased(tails))}


def delivery_rows(modules: list[Row], engines: list[Row], leases: list[Row]) -> list[Row]:
    """Return the state at delivery of the HPTs under mirror terms: new."""
    tails = {row["tail"]: row["lease"] for row in leases if row["terms"] == "B"}
    lease_of = {e["engine_serial"]: tails[e["tail"]] for e in engines if e.get("tail") in tails}
    return [
        {"lease": lease_of[m["engine_serial"]], "serial": m["module_serial"], "hours_since_restoration": 0}
        for m in modules
        if m["module"] == "HPT" and m.get("engine_serial") in lease_of
    ]


__all__ = ["AS_OF", "LESSORS", "delivery_rows", "lease_tables", "leased", "owners"]
