"""A made-up fleet of one type, as values: so many aircraft of two engines, five modules, lives spread along a line."""

from __future__ import annotations

import datetime as dt

from sim.fleet import (
    Aircraft,
    Base,
    Engine,
    EngineType,
    Fleet,
    Hazard,
    LeaseMarket,
    Module,
    ModuleType,
    Part,
    PartLimit,
    PartType,
    Rating,
    Route,
    Settings,
    Shop,
    ShopWork,
    Strategy,
    Team,
    Visit,
    WearRow,
    Work,
)

# module: (behind, place, exchange days, spare price, repair median, restoration cost, interval, distress scale)
MODULES = {
    "fan": ((), "near_wing", 3.0, 1.5e6, 45.0, 250e3, 14000, None),
    "HPC": (("fan", "LPT", "HPT"), "shop", 0.0, 1.9e6, 80.0, 800e3, 9000, None),
    "HPT": (("LPT",), "shop", 0.0, 2.3e6, 70.0, 1500e3, 7500, 11400.0),
    "LPT": ((), "near_wing", 5.0, 1.5e6, 60.0, 550e3, 12000, None),
    "gearbox": ((), "wing", 1.5, 0.45e6, 30.0, 80e3, 20000, None),
}
LIMITS = {"fan": 25000, "HPC": 20000, "HPT": 15000, "LPT": 22000}
LOSS_SHARE = {"fan": 0.05, "HPC": 0.25, "HPT": 0.55, "LPT": 0.15, "gearbox": 0.0}
VISITS = {"quick": (35.0, 150e3), "module_exchange": (40.0, 200e3), "core": (95.0, 320e3), "overhaul": (120.0, 380e3)}


def line_fleet(
    *,
    aircraft: int = 10,
    spares: int = 2,
    shelf: tuple[str, ...] = (),
    hazards: bool = True,
    parts: bool = True,
    wear: bool = True,
    horizon_years: float = 5.0,
    seed_step: int = 1,
) -> Fleet:
    """Return the fleet. Ages step evenly from engine to engine, so that removals spread over the years."""
    modules: list[Module] = []
    found: list[Part] = []
    engines: list[Engine] = []
    count = 2 * aircraft + spares
    for number in range(count):
        serial, wing = f"E{number + 1:03d}", number < 2 * aircraft
        engines.append(
            Engine(
                engine_serial=serial,
                engine_type="N",
                place="wing" if wing else "spare",
                tail=f"T{number // 2 + 1:03d}" if wing else "",
                position=number % 2 + 1 if wing else None,
                base="Home" if number % 3 else "Dune",
                owner="Own",
            )
        )
        # a step prime to the count visits every age once, so that neighbours differ
        age = 1500 + (number * 7 * seed_step % count) * 10000 // count
        for name in MODULES:
            modules.append(_module(f"{name}-{number + 1:03d}", name, age, engine_serial=serial))
            if parts and name in LIMITS:
                found.append(_part(f"P-{name}-{number + 1:03d}", name, age))
    for number, name in enumerate(shelf):
        modules.append(_module(f"S-{name}-{number + 1}", name, 4000))
        if parts and name in LIMITS:
            found.append(_part(f"P-S-{name}-{number + 1}", name, 4000))
    return Fleet(
        settings=Settings(as_of=dt.date(2026, 7, 1), fleet_name="Line", horizon_years=horizon_years),
        engine_types=(
            EngineType(
                engine_type="N",
                redline_degC=925.0,
                removal_margin_degC=5.0,
                cruise_fuel_kg_per_hour=1180.0,
                engine_change_days=1.5,
                engine_change_usd=25e3,
                spare_price_usd=11.5e6,
                out_of_service_usd_per_day=42e3,
            ),
        ),
        ratings=(Rating(engine_type="N", rating="high", thrust_kN=108.0, new_margin_degC=60.0),),
        module_types=tuple(_module_type(name) for name in MODULES),
        wear=tuple(_wear(name) for name in MODULES) if wear else (),
        hazards=tuple(_hazards()) if hazards else (),
        work=tuple(row for name in MODULES for row in _work(name)),
        visits=tuple(
            Visit(engine_type="N", visit=v, engine_level_usd=usd, test_usd=60e3) for v, (_, usd) in VISITS.items()
        ),
        part_types=tuple(
            PartType(part_number=f"{name}-D", engine_type="N", module=name, price_usd=300e3) for name in LIMITS
        )
        if parts
        else (),
        part_limits=tuple(
            PartLimit(part_number=f"{name}-D", rating="high", limit_cycles=limit) for name, limit in LIMITS.items()
        )
        if parts
        else (),
        shops=(
            Shop(
                shop="Alpha",
                engine_type="N",
                inductions_per_month=3.0,
                module_inductions_per_month=4.0,
                transport_days=6.0,
                engine_transport_usd=25e3,
                module_transport_usd=8e3,
            ),
        ),
        shop_work=tuple(
            ShopWork(shop="Alpha", engine_type="N", visit=v, days_median=days, days_p90=1.35 * days)
            for v, (days, _) in VISITS.items()
        ),
        bases=(Base(base="Home"), Base(base="Dune", environment=1.2)),
        aircraft=tuple(
            Aircraft(
                tail=f"T{n + 1:03d}",
                engine_type="N",
                rating="high",
                base="Home" if n % 3 else "Dune",
                hours_per_year=3100.0,
                cycles_per_year=1900.0,
                average_derate_frac=0.08,
                owner="Own",
            )
            for n in range(aircraft)
        ),
        engines=tuple(engines),
        modules=tuple(modules),
        parts=tuple(found),
        strategies=(
            Strategy(strategy="whole_engine", way_out="whole_engine"),
            Strategy(strategy="exchange", way_out="exchange"),
        ),
        teams=(Team(team="Field", call_out_days=2.0, call_out_usd=18e3),),
        lease_market=(LeaseMarket(engine_type="N", usd_per_month=100e3, usd_per_hour=210.0, usd_per_cycle=200.0),),
        routes=(Route(from_place="Dune", to_place="Home", days=3.0),),
    )


def _module(serial: str, name: str, age: int, engine_serial: str = "") -> Module:
    since = age * 2 // 5
    return Module(
        module_serial=serial,
        engine_type="N",
        module=name,
        engine_serial=engine_serial,
        place="" if engine_serial else "pool",
        owner="Own",
        hours_since_new=age * 1.63,
        cycles_since_new=age,
        hours_since_restoration=since * 1.63,
        cycles_since_restoration=since,
        hours_since_build=since * 1.63,
        cycles_since_build=since,
    )


def _part(serial: str, name: str, age: int) -> Part:
    module = serial[2:]
    return Part(
        part_serial=serial,
        part_number=f"{name}-D",
        module_serial=module,
        owner="Own",
        cycles_since_new=age,
        hours_since_new=age * 1.63,
        made_day=-3000.0,
        flown=(("high", age),),
    )


def _module_type(name: str) -> ModuleType:
    behind, place, days, price, repair, _, _, _ = MODULES[name]
    return ModuleType(
        engine_type="N",
        module=name,
        behind=behind,
        exchange_place=place,
        exchange_days=days,
        exchange_usd=30e3,
        spare_price_usd=price,
        repair_days_median=repair,
        repair_days_p90=1.35 * repair,
    )


def _wear(name: str) -> WearRow:
    share = LOSS_SHARE[name]
    return WearRow(
        engine_type="N",
        rating="high",
        module=name,
        early_loss_degC=13.0 * share,
        loss_degC_per_1000_cycles=4.3 * share,
        loss_degC_per_1000_hours=0.25 * share,
        unrecoverable_degC=15.0 * share,
        spread_frac=0.1,
        fuel_frac_per_degC=0.0005,
    )


def _hazards() -> list[Hazard]:
    shares = {"fan": 0.30, "HPC": 0.15, "HPT": 0.20, "LPT": 0.10, "gearbox": 0.25}
    rows = []
    for run in ("first", "mature"):
        for name, share in shares.items():
            rows.append(
                Hazard(
                    engine_type="N",
                    module=name,
                    cause="unscheduled",
                    run=run,
                    scale=1000.0 / (0.018 * share),
                    clock="hours",
                    environment_exponent=1.0,
                )
            )
            rows.append(
                Hazard(
                    engine_type="N",
                    module=name,
                    cause="early",
                    run=run,
                    counted_from="build",
                    probability_within=0.02 * share,
                    ends_after_cycles=150,
                )
            )
            scale = MODULES[name][7]
            if scale is not None:
                rows.append(Hazard(engine_type="N", module=name, cause="distress", run=run, shape=3.0, scale=scale))
    return rows


def _work(name: str) -> list[Work]:
    usd, interval = MODULES[name][5], MODULES[name][6]
    return [
        Work(
            engine_type="N",
            module=name,
            level=level,
            cost_usd=usd * factor,
            restores_frac=restores,
            renews_hardware=restores > 0.0,
            access_usd=40e3,
            expected_interval_cycles=interval if level == "restoration" else None,
        )
        for level, factor, restores in (("check", 0.15, 0.0), ("restoration", 1.0, 1.0), ("overhaul", 1.3, 1.0))
    ]
