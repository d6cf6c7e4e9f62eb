"""Leases of the scenario: four invented lessors, their terms, settlements, deliveries and reserve accounts.

Every other tail of a sub-fleet is leased. Terms A, B and C are those of the first three lessors; the fourth uses B.
"""

from __future__ import annotations

import datetime as dt

from planner.demo.deliver import type_of
from planner.demo.luck import spread, uniform
from planner.demo.sub_fleets import SUB_FLEETS, Tail
from planner.demo.type_tables import Row

LESSORS = ("Amber Leasing", "Birch Aero Finance", "Cobalt Engines", "Delta Quay Leasing")
_TERMS = ("A", "B", "C", "B")
_RULES = ("own_back", "own_back", "title_swap", "own_back")
_APPROVAL_DAYS = {"own_back": 45, "title_swap": 30}
_FIRST, _LAST = dt.date(2026, 12, 1), dt.date(2031, 1, 31)
_FIRST_PLAIN = dt.date(2028, 9, 1)  # far enough for no condition to be short yet
_EXTENDED_FRAC, _REPLACED_FRAC = 0.6, 0.3
# by terms and type: least cycles on every part, most hours since restoration, least margin, least cycles to removal
_CONDITIONS = {
    ("A", "N"): (4000, 7000, 15, None),
    ("A", "W"): (1500, 10000, 15, None),
    ("B", "N"): (3500, None, 12, 2500),
    ("B", "W"): (1200, None, 10, 1200),
    ("C", "N"): (2000, 9000, 8, None),
    ("C", "W"): (600, 12000, 8, None),
}
_RESERVES_USD_PER_HOUR = {"N": 330, "W": 450}
_PART_USD_PER_CYCLE = {"N": 25.0, "W": 90.0}
_HOURS_PER_CYCLE = {"N": 1.8, "W": 5.0}
_RESERVES_YEARS = 2.0  # of paying in, on average, since the last qualifying visit
_ESCALATION_FRAC = 0.04


def leased(tails: list[Tail]) -> list[Tail]:
    """Return the leased tails: about half of the fleet."""
    return [tail for tail in tails if tail.number % 2 == 0 and not tail.joins_later]


def owners(tails: list[Tail]) -> dict[str, str]:
    """Return the owner of each leased tail."""
    return {tail.tail: LESSORS[_lessor(tail)] for tail in leased(tails)}


def _lessor(tail: Tail) -> int:
    return (tail.number // 2 + SUB_FLEETS.index(tail.sub_fleet)) % len(LESSORS)


def lease_tables(tails: list[Tail], *, seed: int, plain: bool) -> dict[str, list[Row]]:
    """Return leases, terms, settlements and accounts; in a plain fleet no lease returns within two years."""
    kinds = sorted({tail.sub_fleet.engine_type for tail in tails})
    chosen = leased(tails)
    return {
        "leases": [_lease(tail, seed=seed, first=_FIRST_PLAIN if plain else _FIRST) for tail in chosen],
        "lease_terms": [row for terms in "ABC" for kind in kinds for row in _terms(terms, kind)],
        "lease_settlements": [row for terms in "ABC" for kind in kinds for row in _settlements(terms, kind)],
        "reserve_accounts": [
            row for tail in chosen if _TERMS[_lessor(tail)] != "B" for row in _accounts(tail, seed=seed)
        ],
    }


def lease_of(tail: Tail) -> str:
    return f"L-{tail.tail}"


def _lease(tail: Tail, *, seed: int, first: dt.date) -> Row:
    lessor, count, code = _lessor(tail), tail.number // 2, tail.sub_fleet.code
    follow = spread(count, uniform(seed, "after", code))
    after = "leave"
    if follow < _EXTENDED_FRAC + _REPLACED_FRAC:
        after = "extend" if follow < _EXTENDED_FRAC else "replace"
    day = first + dt.timedelta(days=round((_LAST - first).days * spread(count, uniform(seed, "return", code))))
    return {
        "lease": lease_of(tail),
        "tail": tail.tail,
        "owner": LESSORS[lessor],
        "return_date": day.isoformat(),
        "terms": _TERMS[lessor],
        "exchange_rule": _RULES[lessor],
        "approval_days": _APPROVAL_DAYS[_RULES[lessor]],
        "after_return": after,
        "extend_years": 6,
    }


def _accounts(tail: Tail, *, seed: int) -> list[Row]:
    """Return reserves by the hour for visits, and by the cycle for parts: list price over limit."""
    sub = tail.sub_fleet
    kind = type_of(sub.engine_type)
    rate = _RESERVES_USD_PER_HOUR[sub.engine_type]
    place = [rating for rating, *_ in kind.ratings].index(tail.rating)
    by_cycle = round(sum(1000 * price / limits[place] for _, _, _, price, limits in kind.parts), 2)
    years = _RESERVES_YEARS * (0.5 + uniform(seed, "balance", tail.tail))
    base = {"lease": lease_of(tail), "escalation_frac": _ESCALATION_FRAC}
    return [
        base | {"event": "engine", "balance_usd": round(rate * 2 * sub.hours * years, -3), "usd_per_hour": rate},
        base
        | {"event": "parts", "balance_usd": round(by_cycle * 2 * sub.cycles * years, -3)}
        | {"usd_per_cycle": by_cycle},
    ]


def _terms(terms: str, kind: str) -> list[Row]:
    cycles, hours, margin, ahead = _CONDITIONS[terms, kind]
    base: Row = {"terms": terms, "engine_type": kind}
    short: Row = {"remedy": "hard"}
    if terms == "B":
        short = {"remedy": "pay_short", "usd_per_unit_short": _PART_USD_PER_CYCLE[kind]}
    rows: list[Row] = [{"condition": "part_cycles", "per": "part", "least": cycles} | short]
    if hours is not None:
        rows.append({"condition": "hours_since_restoration", "per": "engine", "most": hours, "remedy": "hard"})
    rows.append({"condition": "margin", "per": "engine", "least": margin, "remedy": "hard"})
    if ahead is not None:
        rows.append({"condition": "cycles_to_removal", "per": "engine", "least": ahead, "remedy": "hard"})
    rows.append({"condition": "own_serials", "per": "engine", "remedy": "hard"})
    return [base | row for row in rows]


def _settlements(terms: str, kind: str) -> list[Row]:
    """A: half life and reserves. B: mirrors, one-way for the HPT and two-way for the LPT. C: full life and reserves."""
    base: Row = {"terms": terms, "engine_type": kind}
    modules = {m.module: m for m in type_of(kind).modules}
    hpt, lpt = modules["HPT"], modules["LPT"]
    if terms == "B":
        by_hour = 1000 * lpt.restoration / (lpt.interval * _HOURS_PER_CYCLE[kind])
        by_cycle = 1000 * hpt.restoration / hpt.interval
        grows = {"escalation_frac": _ESCALATION_FRAC}
        return [
            base
            | {"event": "HPT", "basis": "mirror_one_way", "clock": "cycles", "rate_usd": round(by_cycle, 2)}
            | grows,
            base | {"event": "LPT", "basis": "mirror_two_way", "clock": "hours", "rate_usd": round(by_hour, 2)} | grows,
        ]
    money = {"expected_interval": hpt.interval, "event_cost_usd": 1000 * hpt.restoration}
    basis = "half_life" if terms == "A" else "full_life"
    return [
        base | {"event": "HPT", "basis": basis, "clock": "cycles", "escalation_frac": _ESCALATION_FRAC} | money,
        base | {"event": "engine", "basis": "reserves"},
    ]


def delivery_rows(modules: list[Row], engines: list[Row], leases: list[Row]) -> list[Row]:
    """Return the state at delivery of what mirror terms look at: the HPT as new, the LPT some way into its run."""
    tails = {row["tail"]: row["lease"] for row in leases if row["terms"] == "B"}
    under = {e["engine_serial"]: tails[e["tail"]] for e in engines if e.get("tail") in tails}
    hours = {"HPT": 0, "LPT": 4000}
    return [
        {
            "lease": under[m["engine_serial"]],
            "serial": m["module_serial"],
            "hours_since_restoration": hours[m["module"]],
        }
        for m in modules
        if m["module"] in hours and m.get("engine_serial") in under
    ]
