"""The fleet as values: one frozen row for each row of a table, and the fleet that holds them all.

Fields carry the names of the tables' columns. Dates are days from the as-of date (``x_date`` becomes ``x_day``; None
where the table is blank), lists are tuples, yes and no are booleans. Nothing here computes: life, wear and prices
have their own files, and a scenario is ``dataclasses.replace`` of a fleet.
"""

from __future__ import annotations

import datetime as dt
from dataclasses import dataclass, field


@dataclass(frozen=True, slots=True, kw_only=True)
class Settings:
    """The settings that the simulation and its pricing read; see planner/schema/setting_tables.py."""

    as_of: dt.date
    fleet_name: str = "Fleet"
    demo: bool = False
    currency: str = "USD"
    price_date: dt.date | None = None
    horizon_years: float = 10.0
    discount_rate_frac: float = 0.085
    fuel_price_usd_per_kg: float = 0.85
    spare_keeping_frac_per_year: float = 0.02
    co2_kg_per_kg_fuel: float = 3.16
    co2_price_usd_per_kg: float = 0.0
    findings_sigma: float = 0.18
    warning_band_cycles: int = 500
    weak_margin_degC: float = 12.0
    weak_cycles: int = 600
    fresh_cycles: int = 150
    weak_pair_usd: float = 60_000.0
    cover_wanted_frac: float = 0.9


@dataclass(frozen=True, slots=True, kw_only=True)
class Index:
    index: str
    per_year_frac: float
    step_month: int = 1


@dataclass(frozen=True, slots=True, kw_only=True)
class EngineType:
    engine_type: str
    redline_degC: float
    removal_margin_degC: float
    cruise_fuel_kg_per_hour: float
    engine_change_days: float
    engine_change_usd: float
    spare_price_usd: float
    out_of_service_usd_per_day: float
    bypass_ratio: float | None = None
    overall_pressure_ratio: float | None = None
    corner_point_degC: float = 30.0
    egt_per_ambient: float = 3.2
    reading_noise_degC: float = 2.5
    reference_derate_frac: float = 0.08
    wear_frac_per_derate_frac: float = 2.0
    cover_wanted_frac: float | None = None
    build_goal_frac: float = 1.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Rating:
    engine_type: str
    rating: str
    thrust_kN: float
    new_margin_degC: float
    margin_spread_degC: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class ModuleType:
    engine_type: str
    module: str
    exchange_place: str
    spare_price_usd: float
    repair_days_median: float
    repair_days_p90: float
    behind: tuple[str, ...] = ()
    exchange_days: float = 0.0
    exchange_usd: float = 0.0
    check_after: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class WearRow:
    """How a module wears at a rating, in degC (a table in efficiency is converted before it comes here)."""

    engine_type: str
    rating: str
    module: str
    early_loss_degC: float = 0.0
    early_scale_cycles: float = 700.0
    loss_degC_per_1000_cycles: float = 0.0
    loss_degC_per_1000_hours: float = 0.0
    unrecoverable_degC: float = 0.0
    spread_frac: float = 0.0
    fuel_frac_per_degC: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Wash:
    engine_type: str
    base: str
    gain_degC: float
    half_life_cycles: float
    every_cycles: int
    cost_usd: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Hazard:
    engine_type: str
    module: str
    cause: str
    run: str
    shape: float = 1.0
    scale: float | None = None
    clock: str = "cycles"
    counted_from: str = "restoration"
    probability_within: float | None = None
    ends_after_cycles: int | None = None
    environment_exponent: float = 0.0
    least_level: str = "restoration"


@dataclass(frozen=True, slots=True, kw_only=True)
class Standard:
    engine_type: str
    module: str
    standard: str
    mates_with_module: str
    mates_with_standard: str


@dataclass(frozen=True, slots=True, kw_only=True)
class Work:
    engine_type: str
    module: str
    level: str
    cost_usd: float
    material_frac: float = 0.45
    repair_frac: float = 0.35
    labour_frac: float = 0.20
    findings_sigma: float | None = None
    restores_frac: float = 0.0
    renews_hardware: bool = False
    access_usd: float = 0.0
    expected_interval_cycles: int | None = None
    expected_interval_hours: int | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Visit:
    engine_type: str
    visit: str
    engine_level_usd: float
    test_usd: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class PartType:
    part_number: str
    engine_type: str
    module: str
    price_usd: float
    name: str = ""
    index: str = "parts"
    counting_rule: str = "linear"
    lead_days: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class PartLimit:
    part_number: str
    rating: str
    limit_cycles: int
    limit_hours: int | None = None
    limit_days: int | None = None
    valid_from_day: float | None = None
    serial_prefix: str = ""
    serial_from: int | None = None
    serial_to: int | None = None
    directive: str = ""
    source: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Shop:
    shop: str
    engine_type: str
    inductions_per_month: float | None = None
    module_inductions_per_month: float | None = None
    bays: int | None = None
    module_bays: int | None = None
    transport_days: float = 0.0
    engine_transport_usd: float = 0.0
    module_transport_usd: float = 0.0
    price_factor: float = 1.0
    contract_days: float | None = None
    late_usd_per_day: float = 0.0
    pay_days_after_release: int = 0
    turn_time_law: str = "lognormal"


@dataclass(frozen=True, slots=True, kw_only=True)
class ShopWork:
    shop: str
    engine_type: str
    visit: str
    days_median: float
    days_p90: float | None = None
    price_factor: float = 1.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Slot:
    shop: str
    engine_type: str
    slot_day: float
    state: str
    engine_serial: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Team:
    team: str
    base: str = ""
    engine_types: tuple[str, ...] = ()
    jobs_at_a_time: int = 1
    call_out_days: float = 0.0
    call_out_usd: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class LeaseMarket:
    engine_type: str
    usd_per_month: float
    usd_per_hour: float = 0.0
    usd_per_cycle: float = 0.0
    least_days: int = 30
    lead_days: float = 10.0
    chance: float = 0.6
    summer_chance: float | None = None
    retry_days: float = 14.0
    deliver_usd: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Route:
    from_place: str
    to_place: str
    days: float
    engine_usd: float = 0.0
    module_usd: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Base:
    base: str
    environment: float = 1.0
    hot_day_degC: tuple[float | None, ...] = (None,) * 12


@dataclass(frozen=True, slots=True, kw_only=True)
class Aircraft:
    tail: str
    engine_type: str
    rating: str
    base: str
    hours_per_year: float
    cycles_per_year: float
    sub_fleet: str = ""
    positions: int = 2
    hours_since_new: float = 0.0
    cycles_since_new: int = 0
    average_derate_frac: float = 0.0
    etops_minutes: int = 0
    owner: str = ""
    entry_day: float | None = None
    exit_day: float | None = None
    rating_until_day: float | None = None
    rating_after: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Engine:
    engine_serial: str
    engine_type: str
    place: str
    tail: str = ""
    position: int | None = None
    base: str = ""
    shop: str = ""
    visit: str = ""
    removed_day: float | None = None
    inducted_day: float | None = None
    ready_day: float | None = None
    lease_in_until_day: float | None = None
    owner: str = ""
    standard: str = ""
    first_run: bool = False
    hours_since_new: float = 0.0
    cycles_since_new: int = 0
    cycles_since_build: int = 0


@dataclass(frozen=True, slots=True, kw_only=True)
class Module:
    module_serial: str
    engine_type: str
    module: str
    engine_serial: str = ""
    place: str = ""
    base: str = ""
    shop: str = ""
    ready_day: float | None = None
    level_in_work: str = ""
    standard: str = ""
    owner: str = ""
    hours_since_new: float = 0.0
    cycles_since_new: int = 0
    hours_since_restoration: float = 0.0
    cycles_since_restoration: int = 0
    hours_since_build: float = 0.0
    cycles_since_build: int = 0
    first_run: bool = False
    margin_lost_degC: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Part:
    """A part serial. ``flown`` holds (rating, cycles) over its whole life; ``life_known`` is false where records do not
    prove it (blank cycles, short history, status not substantiated), and then its life counts as zero."""

    part_serial: str
    part_number: str
    module_serial: str = ""
    place: str = ""
    ready_day: float | None = None
    owner: str = ""
    asking_price_usd: float | None = None
    cycles_since_new: int | None = None
    hours_since_new: float | None = None
    made_day: float | None = None
    status_substantiated: bool = True
    trace_to_birth: bool = False
    flown: tuple[tuple[str, int], ...] = ()
    life_known: bool = True


@dataclass(frozen=True, slots=True, kw_only=True)
class Watch:
    serial: str
    finding: str
    found_day: float
    module: str = ""
    inspect_every_cycles: int | None = None
    remove_by_cycles: int | None = None
    remove_by_day: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class Lease:
    lease: str
    owner: str
    return_day: float
    terms: str
    tail: str = ""
    engine_serial: str = ""
    exchange_rule: str = "own_back"
    approval_days: int = 0
    after_return: str = "leave"
    extend_years: float = 6.0


@dataclass(frozen=True, slots=True, kw_only=True)
class LeaseTerm:
    terms: str
    engine_type: str
    condition: str
    per: str
    least: float | None = None
    most: float | None = None
    remedy: str = "hard"
    usd_per_unit_short: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class LeaseSettlement:
    terms: str
    engine_type: str
    event: str
    basis: str
    expected_interval: float | None = None
    clock: str = "cycles"
    event_cost_usd: float = 0.0
    rate_usd: float = 0.0
    escalation_frac: float = 0.0


@dataclass(frozen=True, slots=True, kw_only=True)
class LeaseDelivery:
    lease: str
    serial: str
    cycles_left: int | None = None
    hours_since_restoration: float | None = None


@dataclass(frozen=True, slots=True, kw_only=True)
class ReserveAccount:
    lease: str
    event: str
    balance_usd: float = 0.0
    usd_per_hour: float = 0.0
    usd_per_cycle: float = 0.0
    escalation_frac: float = 0.04


@dataclass(frozen=True, slots=True, kw_only=True)
class Strategy:
    strategy: str
    way_out: str
    build_goal_cycles: int = 6000
    stub_cycles: int = 2500
    wait_for_module_days: float = 10.0
    plan_ahead_cycles: int = 0
    match: str = "life"
    rob: bool = False
    lease_in_after_days: float | None = 3.0


@dataclass(frozen=True, slots=True, kw_only=True)
class Holding:
    engine_type: str
    module: str
    count: int
    base: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Utilisation:
    tail: str
    from_day: float
    hours_per_year: float
    cycles_per_year: float


@dataclass(frozen=True, slots=True, kw_only=True)
class Agreed:
    day: float
    what: str
    serials: tuple[str, ...]
    note: str = ""


@dataclass(frozen=True, slots=True, kw_only=True)
class Fleet:
    """Everything that a study starts from. Order of rows is the order of the tables and never changes a result."""

    settings: Settings
    engine_types: tuple[EngineType, ...]
    ratings: tuple[Rating, ...]
    module_types: tuple[ModuleType, ...]
    wear: tuple[WearRow, ...]
    hazards: tuple[Hazard, ...]
    work: tuple[Work, ...]
    visits: tuple[Visit, ...]
    part_types: tuple[PartType, ...]
    part_limits: tuple[PartLimit, ...]
    shops: tuple[Shop, ...]
    shop_work: tuple[ShopWork, ...]
    bases: tuple[Base, ...]
    aircraft: tuple[Aircraft, ...]
    engines: tuple[Engine, ...]
    modules: tuple[Module, ...]
    parts: tuple[Part, ...]
    strategies: tuple[Strategy, ...]
    season: tuple[float, ...] = (1.0,) * 12
    indices: tuple[Index, ...] = ()
    washes: tuple[Wash, ...] = ()
    standards: tuple[Standard, ...] = ()
    slots: tuple[Slot, ...] = ()
    teams: tuple[Team, ...] = ()
    lease_market: tuple[LeaseMarket, ...] = ()
    routes: tuple[Route, ...] = ()
    watch: tuple[Watch, ...] = ()
    leases: tuple[Lease, ...] = ()
    lease_terms: tuple[LeaseTerm, ...] = ()
    lease_settlements: tuple[LeaseSettlement, ...] = ()
    lease_delivery: tuple[LeaseDelivery, ...] = ()
    reserve_accounts: tuple[ReserveAccount, ...] = ()
    holdings: tuple[Holding, ...] = ()
    utilisation: tuple[Utilisation, ...] = ()
    agreed: tuple[Agreed, ...] = ()
    assumptions: tuple[str, ...] = field(default=())
