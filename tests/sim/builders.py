"""Small fleets for tests: everything deterministic and plain unless a test says otherwise."""

from __future__ import annotations

import datetime as dt
from dataclasses import replace
from typing import Any

from sim.fleet import (
    Aircraft,
    Base,
    Engine,
    EngineType,
    Fleet,
    Hazard,
    Module,
    ModuleType,
    Part,
    PartLimit,
    PartType,
    Rating,
    Settings,
    Shop,
    ShopWork,
    Strategy,
    Visit,
    WearRow,
    Work,
)

LIMIT_CYCLES = 1000


def tiny_fleet(*, tails: int = 2, spares: int = 1, parts: bool = True, **changes: Any) -> Fleet:
    """Return one-engine aircraft of type T: modules fan (near wing) and core (shop), one part each, no chance causes.

    One cycle an hour, 1,461 cycles a year (4 a day), a fixed 20-day visit, 5 days each way, a change of 2 days.
    """
    engines, modules, part_rows = [], [], []
    for i in range(tails + spares):
        serial = f"E{i + 1}"
        on = i < tails
        engines.append(
            Engine(
                engine_serial=serial,
                engine_type="T",
                place="wing" if on else "spare",
                tail=f"A{i + 1}" if on else "",
                position=1 if on else None,
            )
        )
        for name in ("fan", "core"):
            modules.append(Module(module_serial=f"{name}-{i + 1}", engine_type="T", module=name, engine_serial=serial))
            if parts:
                part_rows.append(
                    Part(
                        part_serial=f"{name}-disk-{i + 1}",
                        part_number=f"{name}-disk",
                        module_serial=f"{name}-{i + 1}",
                        cycles_since_new=0,
                    )
                )
    limits = {"fan-disk": 10 * LIMIT_CYCLES, "core-disk": LIMIT_CYCLES}
    fleet = Fleet(
        settings=Settings(as_of=dt.date(2026, 7, 1), findings_sigma=0.0, discount_rate_frac=0.0),
        engine_types=(
            EngineType(
                engine_type="T",
                redline_degC=900.0,
                removal_margin_degC=0.0,
                cruise_fuel_kg_per_hour=1000.0,
                engine_change_days=2.0,
                engine_change_usd=10_000.0,
                spare_price_usd=3_652_500.0,
                out_of_service_usd_per_day=1_000.0,
            ),
        ),
        ratings=(Rating(engine_type="T", rating="one", thrust_kN=100.0, new_margin_degC=100.0),),
        module_types=(
            ModuleType(
                engine_type="T",
                module="fan",
                exchange_place="near_wing",
                exchange_days=3.0,
                exchange_usd=3_000.0,
                spare_price_usd=500_000.0,
                repair_days_median=30.0,
                repair_days_p90=30.0,
            ),
            ModuleType(
                engine_type="T",
                module="core",
                behind=("fan",),
                exchange_place="shop",
                spare_price_usd=1_000_000.0,
                repair_days_median=50.0,
                repair_days_p90=50.0,
            ),
        ),
        wear=tuple(WearRow(engine_type="T", rating="one", module=m) for m in ("fan", "core")),
        hazards=(),
        work=tuple(
            Work(
                engine_type="T",
                module=module,
                level=level,
                cost_usd=usd,
                access_usd=1_000.0,
                expected_interval_cycles=100_000,
                restores_frac=frac,
                renews_hardware=frac > 0,
            )
            for module in ("fan", "core")
            for level, usd, frac in (
                ("check", 5_000.0, 0.0),
                ("restoration", 50_000.0, 1.0),
                ("overhaul", 80_000.0, 1.0),
            )
        ),
        visits=tuple(
            Visit(engine_type="T", visit=visit, engine_level_usd=usd, test_usd=2_000.0)
            for visit, usd in (
                ("quick", 10_000.0),
                ("module_exchange", 15_000.0),
                ("core", 20_000.0),
                ("overhaul", 30_000.0),
            )
        ),
        part_types=tuple(
            PartType(part_number=f"{m}-disk", engine_type="T", module=m, price_usd=40_000.0) for m in ("fan", "core")
        ),
        part_limits=tuple(
            PartLimit(part_number=number, rating="one", limit_cycles=limit) for number, limit in limits.items()
        ),
        shops=(
            Shop(
                shop="S",
                engine_type="T",
                transport_days=5.0,
                engine_transport_usd=1_500.0,
                module_transport_usd=700.0,
                turn_time_law="fixed",
            ),
        ),
        shop_work=tuple(
            ShopWork(shop="S", engine_type="T", visit=visit, days_median=20.0)
            for visit in ("quick", "module_exchange", "core", "overhaul")
        ),
        bases=(Base(base="B"),),
        aircraft=tuple(
            Aircraft(
                tail=f"A{i + 1}",
                engine_type="T",
                rating="one",
                base="B",
                hours_per_year=1461.0,
                cycles_per_year=1461.0,
                positions=1,
            )
            for i in range(tails)
        ),
        engines=tuple(engines),
        modules=tuple(modules),
        parts=tuple(part_rows),
        strategies=(
            Strategy(strategy="whole_engine", way_out="whole_engine", build_goal_cycles=900, stub_cycles=100),
            Strategy(strategy="exchange", way_out="exchange", build_goal_cycles=900, stub_cycles=100),
            Strategy(strategy="cheapest", way_out="cheapest", build_goal_cycles=900, stub_cycles=100),
        ),
    )
    return replace(fleet, **changes)


def exponential_removals(fleet: Fleet, *, per_hour: float) -> Fleet:
    """Return the fleet with one exponential cause on the fan, counted in hours, and a check as its cure."""
    hazards = tuple(
        Hazard(
            engine_type="T",
            module="fan",
            cause="unscheduled",
            run=run,
            shape=1.0,
            scale=1.0 / per_hour,
            clock="hours",
            counted_from="build",
            least_level="check",
        )
        for run in ("first", "mature")
    )
    return replace(fleet, hazards=hazards)
