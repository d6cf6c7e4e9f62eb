"""Tables that hold for the whole scenario: settings, prices in time, bases, shops, teams, ways, strategies."""

from __future__ import annotations

import datetime as dt
from typing import Any

from planner.demo.sub_fleets import AS_OF
from planner.demo.type_tables import Row

SEASON = (0.90, 0.86, 0.95, 1.00, 1.04, 1.10, 1.16, 1.15, 1.06, 1.00, 0.90, 0.88)
INDICES = (
    ("parts", 0.060),
    ("material", 0.055),
    ("repair", 0.040),
    ("labour", 0.035),
    ("rent", 0.040),
    ("test", 0.035),
    ("transport", 0.030),
    ("out_of_service", 0.025),
    ("fuel", 0.020),
)
# hot days by month, January first; invented climates
BASES = (
    ("Home", 1.00, (14, 16, 20, 24, 28, 32, 35, 34, 30, 25, 19, 15)),
    ("Dune", 1.45, (26, 28, 33, 38, 42, 44, 45, 45, 42, 38, 32, 27)),
    ("Coast", 1.00, (18, 18, 20, 23, 26, 29, 31, 31, 29, 26, 22, 19)),
    ("North", 1.15, (4, 5, 9, 15, 21, 25, 27, 26, 20, 14, 8, 5)),
)
SHOPS: dict[tuple[str, str], dict[str, Any]] = {
    ("Alpha", "N"): {
        "slots": 1.0,
        "modules": 3.0,
        "transport": 10,
        "price": 1.0,
        "turn": ((35, 55), (40, 60), (95, 130), (120, 165)),
    },
    ("Alpha", "W"): {
        "slots": 0.5,
        "modules": 1.5,
        "transport": 10,
        "price": 1.0,
        "turn": ((50, 75), (60, 90), (125, 165), (160, 210)),
    },
    ("Bravo", "N"): {
        "slots": 0.8,
        "modules": 2.0,
        "transport": 4,
        "price": 0.93,
        "turn": ((40, 60), (45, 68), (110, 150), (135, 180)),
    },
    ("Charlie", "W"): {
        "slots": 0.4,
        "modules": 1.0,
        "transport": 14,
        "price": 1.0,
        "turn": ((55, 80), (66, 98), (135, 180), (170, 225)),
    },
}


def scenario_tables(kinds: set[str], *, scale: float) -> dict[str, list[Row]]:
    """Return them for the types that fly. ``scale``: size against the fleet of 40; slots and teams grow with it."""
    tables: dict[str, list[Row]] = {
        "settings": _settings(),
        "indices": [{"index": name, "per_year_frac": frac, "step_month": 1} for name, frac in INDICES],
        "season": [{"month": month + 1, "share": share} for month, share in enumerate(SEASON)],
        "bases": [
            {"base": base, "environment": factor} | {f"hot_day_degC_{m + 1:02d}": t for m, t in enumerate(hot)}
            for base, factor, hot in BASES
        ],
        "washes": [_wash(kind, base, factor) for kind in sorted(kinds) for base, factor, _ in BASES],
        "teams": [
            {
                "team": "Line team",
                "base": "Home",
                "jobs_at_a_time": max(1, round(scale)),
                "call_out_days": 2,
                "call_out_usd": 18_000,
            }
        ],
        "routes": _routes(),
        "slots": [
            row for (shop, kind), what in SHOPS.items() if kind in kinds for row in _slots(shop, kind, what["slots"])
        ],
        "strategies": _strategies(),
        "standards": _standards() if "N" in kinds else [],
    }
    return tables | _shops(kinds, scale)


def _settings() -> list[Row]:
    """Return the settings of the scenario."""
    values = {
        "as_of": AS_OF.isoformat(),
        "fleet_name": "Harbour Wings",
        "demo": "yes",
        "currency": "USD",
        "price_date": "2026-01-01",
        "horizon_years": 10,
        "discount_rate_frac": 0.085,
        "fuel_price_usd_per_kg": 0.85,
        "spare_keeping_frac_per_year": 0.02,
        "findings_sigma": 0.18,
    }
    return [{"name": name, "value": value} for name, value in values.items()]


def _wash(kind: str, base: str, environment: float) -> Row:
    if kind == "N":
        gain, half, cost, every = 5, 300, 4_000, 300 if environment > 1.3 else 500
    else:
        gain, half, cost, every = 4, 120, 9_000, 200
    return {
        "engine_type": kind,
        "base": base,
        "gain_degC": gain,
        "half_life_cycles": half,
        "every_cycles": every,
        "cost_usd": cost,
    }


def _shops(kinds: set[str], scale: float) -> dict[str, list[Row]]:
    shops, work = [], []
    for (shop, kind), row in SHOPS.items():
        if kind not in kinds:
            continue
        big = kind == "W"
        shops.append(
            {
                "shop": shop,
                "engine_type": kind,
                "inductions_per_month": round(row["slots"] * scale, 4),
                "module_inductions_per_month": round(row["modules"] * scale, 4),
                "transport_days": row["transport"],
                "engine_transport_usd": 70_000 if big else 25_000,
                "module_transport_usd": 20_000 if big else 8_000,
                "price_factor": row["price"],
                "pay_days_after_release": 30,
            }
        )
        for visit, (median, p90) in zip(("quick", "module_exchange", "core", "overhaul"), row["turn"], strict=True):
            work.append({"shop": shop, "engine_type": kind, "visit": visit, "days_median": median, "days_p90": p90})
    return {"shops": shops, "shop_work": work}


def _strategies() -> list[Row]:
    common = {
        "build_goal_cycles": 6000,
        "stub_cycles": 2500,
        "wait_for_module_days": 10,
        "plan_ahead_cycles": 0,
        "match": "life",
        "rob": "no",
        "lease_in_after_days": 3,
    }
    return [{"strategy": name, "way_out": name} | common for name in ("whole_engine", "exchange", "cheapest")]


def _standards() -> list[Row]:
    """A pre-modification HPT of type N mates with older LPTs only; modified ones mate with both."""
    pairs = (("post", "old"), ("post", "new"), ("pre", "old"))
    return [
        {
            "engine_type": "N",
            "module": "HPT",
            "standard": hpt,
            "mates_with_module": "LPT",
            "mates_with_standard": lpt,
        }
        for hpt, lpt in pairs
    ]


def _routes() -> list[Row]:
    """Every base has a way to Home and back."""
    ways = [(base, "Home", days) for base, days in (("Dune", 3), ("Coast", 2), ("North", 3))]
    ways += [(to, away, days) for away, to, days in ways]
    return [
        {"from_place": here, "to_place": there, "days": days, "engine_usd": 12_000, "module_usd": 4_000}
        for here, there, days in ways
    ]


def _slots(shop: str, kind: str, a_month: float) -> list[Row]:
    """Return the slots that a shop has offered for the next half year: N from the first of a month, W mid-month."""
    first = AS_OF + dt.timedelta(days=31 if kind == "N" else 45)
    count = max(1, int(6 * a_month))
    days = [first + dt.timedelta(days=round(number * 30.4 / a_month)) for number in range(count)]
    return [{"shop": shop, "engine_type": kind, "slot_date": day.isoformat(), "state": "open"} for day in days]
