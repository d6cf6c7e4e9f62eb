"""Tables that describe the engine types: ratings, wear, hazards, work and its price, parts and their limits."""

from __future__ import annotations

from typing import Any

from planner.demo.types import DEMO_TYPES, DemoModule, DemoType

Row = dict[str, Any]
# what a level gives back of the loss that can be restored; our choice for the scenario
_RESTORES = {"check": 0.0, "restoration": 0.92, "overhaul": 1.0}
_SPLIT = {"check": (0.10, 0.20, 0.70), "restoration": (0.45, 0.35, 0.20), "overhaul": (0.45, 0.35, 0.20)}
_EARLY_CHANCE, _EARLY_CYCLES = 0.02, 150
_SHOP_MODULES_CHECKED = ("gearbox", "fan", "fan-booster", "booster")  # unscheduled removals that a check may cure


def type_tables(kinds: set[str]) -> dict[str, list[Row]]:
    """Return every table that describes the types that fly, so that a small fleet is no larger than it must be."""
    flown = [t for t in DEMO_TYPES if t.row["engine_type"] in kinds]
    tables: dict[str, list[Row]] = {
        "engine_types": [t.row for t in flown],
        "cycles": [{"engine_type": t.row["engine_type"]} | t.cycle for t in flown],
        "lease_market": [{"engine_type": t.row["engine_type"]} | t.lease for t in flown],
    }
    for kind in flown:
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
                "least_level": "check" if m.module in _SHOP_MODULES_CHECKED else "restoration",
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
