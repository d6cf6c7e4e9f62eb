"""The two invented engine types as data. Nothing here is a real engine; every figure is a scenario's."""

from __future__ import annotations

from typing import Any, NamedTuple


class DemoModule(NamedTuple):
    """One module: costs in thousand USD by level, access, exchange, spare price, repair days, interval, wear share."""

    module: str
    behind: str
    place: str
    check: float
    restoration: float
    overhaul: float
    access: float
    exchange: float
    exchange_days: float
    spare: float
    repair_days: float
    interval: int
    wear_share: float
    fuel_per_10degC: float
    unscheduled_share: float
    distress_share: float
    after: str


class DemoType(NamedTuple):
    """One engine type of the scenario."""

    row: dict[str, Any]
    cycle: dict[str, Any]
    ratings: tuple[tuple[str, float, float, float], ...]
    wear: dict[str, tuple[float, float, float, float, float]]
    modules: tuple[DemoModule, ...]
    unscheduled_per_1000_hours: float
    distress_scales: tuple[float, float]
    visits: tuple[tuple[str, float, float], ...]
    parts: tuple[tuple[str, str, str, float, tuple[int, ...]], ...]
    lease: dict[str, Any]
    spread: float


_FAN = "vibration survey, trim balance, power check"
_CORE = "test cell"

TYPE_N = DemoType(
    row={
        "engine_type": "N",
        "bypass_ratio": 6.2,
        "overall_pressure_ratio": 34,
        "redline_degC": 925,
        "corner_point_degC": 30,
        "egt_per_ambient": 3.2,
        "removal_margin_degC": 5,
        "reading_noise_degC": 2.5,
        "reference_derate_frac": 0.08,
        "wear_frac_per_derate_frac": 2.0,
        "cruise_fuel_kg_per_hour": 1180,
        "engine_change_days": 1.5,
        "engine_change_usd": 25_000,
        "spare_price_usd": 11_500_000,
        "out_of_service_usd_per_day": 42_000,
        "cover_wanted_frac": 0.92,
        "build_goal_frac": 1.0,
    },
    cycle={"spools": 2, "exhaust": "separate", "fan_pressure_ratio": 1.65, "booster_pressure_ratio": 1.7},
    ratings=(("low", 90, 112, 3), ("mid", 99, 88, 3), ("high", 108, 60, 3)),
    wear={
        "high": (13, 700, 4.3, 0.25, 15),
        "mid": (12, 700, 3.4, 0.25, 19),
        "low": (10, 700, 2.6, 0.25, 26),
    },
    modules=(
        DemoModule(
            "fan-booster", "", "near_wing", 60, 250, 420, 30, 30, 3, 1500, 45, 14000, 0.04, 0.013, 0.30, 0, _FAN
        ),
        DemoModule(
            "HPC",
            "fan-booster LPT HPT combustor gearbox",
            "shop",
            110,
            800,
            1150,
            90,
            0,
            0,
            1900,
            80,
            9000,
            0.24,
            0.005,
            0.15,
            0,
            _CORE,
        ),
        DemoModule("combustor", "HPT", "shop", 60, 480, 650, 45, 0, 0, 700, 55, 8000, 0.13, 0.005, 0.05, 0.25, _CORE),
        DemoModule("HPT", "LPT", "shop", 140, 1500, 1900, 70, 0, 0, 2300, 70, 7500, 0.50, 0.005, 0.15, 0.75, _CORE),
        DemoModule("LPT", "", "near_wing", 80, 550, 980, 40, 91, 5, 1500, 60, 12000, 0.09, 0.016, 0.10, 0, _FAN),
        DemoModule(
            "gearbox", "", "wing", 20, 80, 150, 10, 12, 1.5, 450, 30, 20000, 0.0, 0.0, 0.25, 0, "leak and idle check"
        ),
    ),
    unscheduled_per_1000_hours=0.018,
    distress_scales=(14_200, 11_400),
    visits=(("quick", 150, 60), ("module_exchange", 200, 60), ("core", 320, 60), ("overhaul", 380, 60)),
    parts=(
        ("NFB-01", "fan-booster", "fan disk", 300, (28000, 28000, 28000)),
        ("NFB-02", "fan-booster", "booster spool", 220, (26000, 26000, 26000)),
        ("NFB-03", "fan-booster", "fan shaft", 180, (28000, 28000, 28000)),
        ("NFB-04", "fan-booster", "front hub", 120, (24000, 24000, 24000)),
        ("NHC-01", "HPC", "front spool", 260, (20000, 19000, 17000)),
        ("NHC-02", "HPC", "rear spool", 310, (20000, 18500, 16000)),
        ("NHC-03", "HPC", "discharge seal", 150, (20000, 18000, 15500)),
        ("NHC-04", "HPC", "front shaft", 120, (20000, 20000, 19000)),
        ("NHT-01", "HPT", "disk", 420, (20000, 17800, 14500)),
        ("NHT-02", "HPT", "front seal", 160, (20000, 18000, 15000)),
        ("NHT-03", "HPT", "rear shaft", 190, (20000, 18500, 16000)),
        ("NHT-04", "HPT", "coupling", 170, (20000, 19000, 16500)),
        ("NHT-05", "HPT", "rear seal plate", 150, (20000, 18200, 15500)),
        ("NLT-01", "LPT", "stage 1 disk", 190, (24000, 24000, 24000)),
        ("NLT-02", "LPT", "stage 2 disk", 200, (24000, 24000, 24000)),
        ("NLT-03", "LPT", "stage 3 disk", 210, (25000, 25000, 25000)),
        ("NLT-04", "LPT", "stage 4 disk", 220, (25000, 25000, 25000)),
        ("NLT-05", "LPT", "shaft", 260, (28000, 28000, 28000)),
        ("NLT-06", "LPT", "support cone", 170, (26000, 26000, 26000)),
    ),
    lease={
        "usd_per_month": 100_000,
        "usd_per_hour": 210,
        "usd_per_cycle": 200,
        "least_days": 30,
        "lead_days": 10,
        "chance": 0.6,
        "summer_chance": 0.35,
        "retry_days": 14,
        "deliver_usd": 50_000,
    },
    spread=0.10,
)

TYPE_W = DemoType(
    row={
        "engine_type": "W",
        "bypass_ratio": 8.6,
        "overall_pressure_ratio": 43,
        "redline_degC": 1055,
        "corner_point_degC": 30,
        "egt_per_ambient": 3.3,
        "removal_margin_degC": 4,
        "reading_noise_degC": 2.5,
        "reference_derate_frac": 0.10,
        "wear_frac_per_derate_frac": 2.0,
        "cruise_fuel_kg_per_hour": 3150,
        "engine_change_days": 2.0,
        "engine_change_usd": 45_000,
        "spare_price_usd": 30_000_000,
        "out_of_service_usd_per_day": 105_000,
        "cover_wanted_frac": 0.90,
        "build_goal_frac": 0.4,
    },
    cycle={"spools": 2, "exhaust": "separate", "fan_pressure_ratio": 1.52, "booster_pressure_ratio": 1.6},
    ratings=(("base", 288, 75, 2), ("plus", 316, 47, 2)),
    wear={"base": (8, 250, 7.2, 0.5, 12), "plus": (8, 250, 7.2, 0.5, 10)},
    modules=(
        DemoModule("fan", "", "near_wing", 120, 450, 900, 60, 55, 5, 2600, 55, 7000, 0.05, 0.013, 0.28, 0, _FAN),
        DemoModule("booster", "fan", "shop", 90, 350, 650, 70, 0, 0, 1600, 60, 7000, 0.05, 0.013, 0.04, 0, _CORE),
        DemoModule(
            "HPC",
            "fan booster LPT HPT combustor gearbox",
            "shop",
            250,
            1700,
            2600,
            190,
            0,
            0,
            4200,
            110,
            3600,
            0.22,
            0.005,
            0.15,
            0,
            _CORE,
        ),
        DemoModule(
            "combustor", "HPT", "shop", 130, 900, 1400, 90, 0, 0, 2000, 75, 3000, 0.12, 0.005, 0.06, 0.25, _CORE
        ),
        DemoModule("HPT", "LPT", "shop", 380, 2900, 3900, 150, 0, 0, 5100, 95, 2900, 0.46, 0.005, 0.17, 0.75, _CORE),
        DemoModule("LPT", "", "near_wing", 260, 1100, 2100, 110, 95, 7, 3300, 80, 4500, 0.10, 0.016, 0.10, 0, _FAN),
        DemoModule(
            "gearbox", "", "wing", 50, 150, 300, 25, 25, 2, 950, 40, 9000, 0.0, 0.0, 0.20, 0, "leak and idle check"
        ),
    ),
    unscheduled_per_1000_hours=0.020,
    distress_scales=(4_200, 3_400),
    visits=(("quick", 260, 110), ("module_exchange", 350, 110), ("core", 600, 110), ("overhaul", 750, 110)),
    parts=(
        ("WFN-01", "fan", "disk", 900, (16500, 16500)),
        ("WFN-02", "fan", "shaft", 700, (16000, 16000)),
        ("WBO-01", "booster", "spool", 450, (15000, 15000)),
        ("WBO-02", "booster", "hub", 350, (16000, 16000)),
        ("WHC-01", "HPC", "stage 1 disk", 600, (11500, 9800)),
        ("WHC-02", "HPC", "mid spool", 520, (11400, 9600)),
        ("WHC-03", "HPC", "rear spool", 480, (11200, 9400)),
        ("WHC-04", "HPC", "rear cone", 450, (11400, 9800)),
        ("WHC-05", "HPC", "discharge seal", 350, (11200, 9300)),
        ("WHC-06", "HPC", "front shaft", 300, (11500, 10000)),
        ("WHT-01", "HPT", "stage 1 disk", 1150, (11000, 8800)),
        ("WHT-02", "HPT", "stage 2 disk", 500, (11200, 9000)),
        ("WHT-03", "HPT", "front seal", 520, (11200, 9200)),
        ("WHT-04", "HPT", "rear shaft", 430, (11400, 9400)),
        ("WHT-05", "HPT", "spacer", 400, (11300, 9100)),
        ("WLT-01", "LPT", "stage 1 disk", 420, (13000, 13000)),
        ("WLT-02", "LPT", "stage 2 disk", 430, (13000, 13000)),
        ("WLT-03", "LPT", "stage 3 disk", 440, (13500, 13500)),
        ("WLT-04", "LPT", "stage 4 disk", 450, (14000, 14000)),
        ("WLT-05", "LPT", "stage 5 disk", 460, (14000, 14000)),
        ("WLT-06", "LPT", "shaft", 500, (16000, 16000)),
        ("WLT-07", "LPT", "support cone", 400, (15000, 15000)),
    ),
    lease={
        "usd_per_month": 190_000,
        "usd_per_hour": 450,
        "usd_per_cycle": 900,
        "least_days": 30,
        "lead_days": 21,
        "chance": 0.5,
        "summer_chance": "",
        "retry_days": 14,
        "deliver_usd": 140_000,
    },
    spread=0.10,
)
DEMO_TYPES = (TYPE_N, TYPE_W)
