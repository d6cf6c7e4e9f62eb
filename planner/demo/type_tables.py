"""Tables that describe types, prices, shops and settings, as rows ready to write."""

from __future__ import annotations

from typing import Any

from planner.demo.types import DEMO_TYPES, DemoModule, DemoType

Row = dict[str, Any]
AS_OF = "2026-07-01"
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
_SPLIT = {"check": (0.10, 0.20, 0.70), "restoration": (0.45, 0.35, 0.20), "overhaul": (0.45, 0.35, 0.20)}
# what a level gives back of the loss that can be restored; our choice for the scenario
_RESTORES = {"check": 0.0, "restoration": 0.92, "overhaul": 1.0}
_EARLY_CHANCE, _EARLY_CYCLES = 0.02, 150


def settings(aircraft: int) -> list[Row]:
    """Return the settings of the scenario."""
    values = {
        "as_of": AS_OF,
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
    del aircraft
    return [{"name": name, "value": value} for name, value in values.items()]


def type_tables(scale: float) -> dict[str, list[Row]]:
    """Return every table that does not list serials. ``scale``: size against the fleet of 40 (slots and teams grow)."""
    tables: dict[str, list[Row]] = {
        "indices": [{"index": name, "per_year_frac": frac, "step_month": 1} for name, frac in INDICES],
        "season": [{"month": month + 1, "share": share} for month, share in enumerate(SEASON)],
        "bases": [
            {"base": base, "environment": factor} | {f"hot_day_degC_{m + 1:02d}": t for m, t in enumerate(hot)}
            for base, factor, hot in BASES
        ],
        "engine_types": [t.row for t in DEMO_TYPES],
        "cycles": [{"engine_type": t.row["engine_type"]} | t.cycle for t in DEMO_TYPES],
        "teams": [
            {
                "team": "Line team",
                "base": "Home",
                "engine_types": "",
                "jobs_at_a_time": max(1, round(scale)),
                "call_out_days": 2,
                "call_out_usd": 18_000,
            }
        ],
        "routes": [
            {"from_place": "Dune", "to_place": to, "days": days, "engine_usd": 12_000, "module_usd": 4_000}
            for to, days in (("Home", 3), ("Coast", 2), ("North", 3))
        ],
        "strategies": _strategies(),
        "lease_market": [{"engine_type": t.row["engine_type"]} | t.lease for t in DEMO_TYPES],
        "standards": _standards(),
    }
    for name, rows in _shops(scale).items():
        tables[name] = rows
    for kind in DEMO_TYPES:
        for name, rows in _one_type(kind).items():
            tables.setdefault(name, []).extend(rows)
    return tables


def _one_type(kind: DemoType) -> dict[str, list[Row]]:
    name = kind.row["engine_type"]
    ratings = [r[0] for r in kind.ratings]
    return {
        "ratings": [
            {
                "engine_type": name,
                "rating": r,
                "thrust_kN": thrust,
                "new_margin_degC": margin,
                "margin_spread_degC": spread,
            }
            for r, thrust, margin, spread in kind.ratings
        ],
        "module_types": [_module(name, m) for m in kind.modules],
        "wear": [
            _wear(name, rating, m, kind.wear[rating], kind.spread)
            for rating in ratings
            for m in kind.modules
            if m.wear_share
        ],
        "washes": [_wash(name, base, factor) for base, factor, _ in BASES],
        "hazards": [row for m in kind.modules for row in _hazards(kind, m)],
        "work": [row for m in kind.modules for row in _work(name, m)],
        "visits": [
            {"engine_type": name, "visit": visit, "engine_level_usd": level * 1000, "test_usd": test * 1000}
            for visit, level, test in kind.visits
        ],
        "part_types": [
            {
                "part_number": number,
                "engine_type": name,
                "module": module,
                "name": what,
                "price_usd": price * 1000,
                "index": "parts",
                "counting_rule": "linear",
                "lead_days": 120,
            }
            for number, module, what, price, _ in kind.parts
        ],
        "part_limits": [
            {"part_number": number, "rating": rating, "limit_cycles": limit, "source": "limits manual, revision 4"}
            for number, _, _, _, limits in kind.parts
            for rating, limit in zip(ratings, limits, strict=True)
        ],
    }


def _module(kind: str, m: DemoModule) -> Row:
    return {
        "engine_type": kind,
        "module": m.module,
        "behind": m.behind,
        "exchange_place": m.place,
        "exchange_days": m.exchange_days,
        "exchange_usd": m.exchange * 1000,
        "spare_price_usd": m.spare * 1000,
        "repair_days_median": m.repair_days,
        "repair_days_p90": round(m.repair_days * 1.35, 2),
        "check_after": m.after,
    }


def _wear(kind: str, rating: str, m: DemoModule, law: tuple[float, ...], spread: float) -> Row:
    early, scale, cycles, hours, stays = law
    share = m.wear_share
    return {
        "engine_type": kind,
        "rating": rating,
        "module": m.module,
        "early_loss_degC": round(early * share, 6),
        "early_scale_cycles": scale,
        "loss_degC_per_1000_cycles": round(cycles * share, 6),
        "loss_degC_per_1000_hours": round(hours * share, 6),
        "unrecoverable_degC": round(stays * share, 6),
        "spread_frac": spread,
        "fuel_frac_per_degC": round(m.fuel_per_10degC / 10.0, 6),
    }


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


def _hazards(kind: DemoType, m: DemoModule) -> list[Row]:
    name = kind.row["engine_type"]
    rows = []
    for number, run in enumerate(("first", "mature")):
        rows.append(
            {
                "engine_type": name,
                "module": m.module,
                "cause": "unscheduled",
                "run": run,
                "shape": 1,
                "scale": round(1000.0 / (kind.unscheduled_per_1000_hours * m.unscheduled_share), 3),
                "clock": "hours",
                "counted_from": "build",
                "environment_exponent": 1,
                "least_level": "check" if m.module in ("gearbox", "fan", "fan-booster", "booster") else "restoration",
            }
        )
        if m.distress_share:
            # a Weibull whose hazard is a share of the engine's has its scale times share ** (-1 / shape)
            scale = kind.distress_scales[number] * m.distress_share ** (-1.0 / 3.0)
            rows.append(
                {
                    "engine_type": name,
                    "module": m.module,
                    "cause": "distress",
                    "run": run,
                    "shape": 3,
                    "scale": round(scale, 3),
                    "clock": "cycles",
                    "counted_from": "restoration",
                    "environment_exponent": 1,
                    "least_level": "restoration",
                }
            )
    chance = 1.0 - (1.0 - _EARLY_CHANCE) ** (1.0 / len(kind.modules))
    for run in ("first", "mature"):
        rows.append(
            {
                "engine_type": name,
                "module": m.module,
                "cause": "early",
                "run": run,
                "counted_from": "build",
                "probability_within": round(chance, 6),
                "ends_after_cycles": _EARLY_CYCLES,
                "least_level": "check",
            }
        )
    return rows


def _work(kind: str, m: DemoModule) -> list[Row]:
    rows = []
    for level, usd in (("check", m.check), ("restoration", m.restoration), ("overhaul", m.overhaul)):
        material, repair, labour = _SPLIT[level]
        rows.append(
            {
                "engine_type": kind,
                "module": m.module,
                "level": level,
                "cost_usd": usd * 1000,
                "material_frac": material,
                "repair_frac": repair,
                "labour_frac": labour,
                "restores_frac": _RESTORES[level],
                "renews_hardware": "no" if level == "check" else "yes",
                "access_usd": m.access * 1000,
                "expected_interval_cycles": "" if level == "check" else m.interval,
            }
        )
    return rows


def _shops(scale: float) -> dict[str, list[Row]]:
    shops, work = [], []
    for (shop, kind), row in SHOPS.items():
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
