"""A fleet made ready to run: tables turned into small indexed values, once for each study.

Everything here is read-only while a run goes on. Modules of a type are numbered in the order of ``module_types``,
ratings in the order of ``ratings``; a module number is called a *slot*.
"""

from __future__ import annotations

import math
from dataclasses import replace
from typing import NamedTuple

from sim.errors import RequestError
from sim.fleet import Aircraft, EngineType, Fleet, LeaseMarket, Strategy, Team, Wash
from sim.pricing import Catalogue, catalogue
from sim.season import Season
from sim.wear import WearLaw, wear_law

LEVELS = ("none", "check", "restoration", "overhaul")
NONE, CHECK, RESTORATION, OVERHAUL = range(4)
CORE_PLACE = "shop"
_P90 = 1.2815515655446004  # standard normal quantile at 0.9


class HazardSpec(NamedTuple):
    cause: str
    shape: float
    scale: float
    hours: bool
    counted_from: str
    exponent: float
    least_level: int


class EarlySpec(NamedTuple):
    probability: float
    ends_after: int


class TurnTime(NamedTuple):
    """A turn-time law: ``law`` lognormal, exponential or fixed; median (or mean) in days; sigma of the log."""

    law: str
    days: float
    sigma: float

    def drawn(self, uniform: float, z: float) -> float:
        """Return the days of a uniform draw (``z`` its standard normal)."""
        if self.law == "exponential":
            return -math.log1p(-uniform) * self.days
        return self.days if self.sigma == 0.0 or self.law == "fixed" else self.days * math.exp(self.sigma * z)

    @property
    def mean_days(self) -> float:
        return self.days * math.exp(self.sigma * self.sigma / 2.0) if self.law == "lognormal" else self.days


class ModuleSpec(NamedTuple):
    """One module of a type. ``behind``: slots that come off first, closed under that rule. ``wear``: a law a rating.
    ``hazards[first_run]``: chance causes. ``restores``, ``renews``, ``interval_*``: by level."""

    engine_type: str
    module: str
    slot: int
    place: str
    exchange_days: float
    behind: tuple[int, ...]
    wear: tuple[WearLaw, ...]
    spread: float
    hazards: tuple[tuple[HazardSpec, ...], tuple[HazardSpec, ...]]
    early: EarlySpec | None
    restores: tuple[float, ...]
    renews: tuple[bool, ...]
    interval_cycles: float
    interval_hours: float
    findings_sigma: tuple[float, ...]
    repair: TurnTime
    restoration_usd: float


class PartSpec(NamedTuple):
    part_number: str
    slot: int
    most_restrictive: bool
    price_usd: float


class TypeSpec(NamedTuple):
    engine_type: str
    number: int
    ratings: tuple[str, ...]
    new_margin: tuple[float, ...]
    margin_spread: tuple[float, ...]
    removal_margin: float
    change_days: float
    fuel_kg_per_hour: float
    modules: tuple[ModuleSpec, ...]
    core: tuple[int, ...]
    spare_price_usd: float
    down_usd_per_day: float


class ShopSpec(NamedTuple):
    """One shop for one type: slots a month or bays (None: no bound), transport, turn time by visit."""

    shop: str
    engine_type: str
    per_month: float | None
    modules_per_month: float | None
    bays: int | None
    module_bays: int | None
    transport_days: float
    turn: dict[str, TurnTime]
    contract_days: float | None
    pay_days: int


class Setup(NamedTuple):
    """All that a run reads."""

    fleet: Fleet
    strategy: dict[str, Strategy]
    horizon_days: float
    season: Season
    catalogue: Catalogue
    types: dict[str, TypeSpec]
    parts: dict[str, PartSpec]
    shops: dict[str, tuple[ShopSpec, ...]]
    teams: tuple[Team, ...]
    market: dict[str, LeaseMarket]
    washes: dict[tuple[str, str], Wash]
    environment: dict[str, float]
    lessors: frozenset[str]
    sweep_days: tuple[float, ...]


def turn_time(law: str, median_days: float, p90_days: float | None) -> TurnTime:
    """Return the law of a median and a 90th percentile (lognormal: sigma = ln(P90 / median) / 1.2816)."""
    if law != "lognormal" or not p90_days or median_days <= 0.0 or p90_days <= median_days:
        return TurnTime("fixed" if law == "lognormal" else law, median_days, 0.0)
    return TurnTime(law, median_days, math.log(p90_days / median_days) / _P90)


def _closure(behind: dict[str, tuple[str, ...]], module: str) -> set[str]:
    """Return every module that must come off before this one (transitively)."""
    found: set[str] = set()
    todo = list(behind.get(module, ()))
    while todo:
        one = todo.pop()
        if one not in found and one != module:
            found.add(one)
            todo.extend(behind.get(one, ()))
    return found


def _module_spec(fleet: Fleet, engine_type: str, slot: int) -> ModuleSpec:
    rows = [m for m in fleet.module_types if m.engine_type == engine_type]
    row = rows[slot]
    slots = {m.module: i for i, m in enumerate(rows)}
    ratings = [r.rating for r in fleet.ratings if r.engine_type == engine_type]
    wear_rows = {(w.rating): w for w in fleet.wear if w.engine_type == engine_type and w.module == row.module}
    laws = []
    for rating in ratings:
        w = wear_rows.get(rating)
        laws.append(
            wear_law(
                early_loss_degC=w.early_loss_degC if w else 0.0,
                early_scale_cycles=w.early_scale_cycles if w else 700.0,
                loss_degC_per_1000_cycles=w.loss_degC_per_1000_cycles if w else 0.0,
                loss_degC_per_1000_hours=w.loss_degC_per_1000_hours if w else 0.0,
                unrecoverable_degC=w.unrecoverable_degC if w else 0.0,
                fuel_frac_per_degC=w.fuel_frac_per_degC if w else 0.0,
            )
        )
    works = {w.level: w for w in fleet.work if w.engine_type == engine_type and w.module == row.module}
    sigma = fleet.settings.findings_sigma
    restoration = works.get("restoration")
    behind = _closure({m.module: m.behind for m in rows}, row.module)
    return ModuleSpec(
        engine_type=engine_type,
        module=row.module,
        slot=slot,
        place=row.exchange_place,
        exchange_days=row.exchange_days,
        behind=tuple(sorted(slots[name] for name in behind if name in slots)),
        wear=tuple(laws),
        spread=max((w.spread_frac for w in wear_rows.values()), default=0.0),
        hazards=(_hazards(fleet, row.module, engine_type, "mature"), _hazards(fleet, row.module, engine_type, "first")),
        early=_early(fleet, row.module, engine_type),
        restores=tuple(works[level].restores_frac if level in works else 0.0 for level in LEVELS),
        renews=tuple(works[level].renews_hardware if level in works else False for level in LEVELS),
        interval_cycles=float((restoration.expected_interval_cycles if restoration else None) or math.inf),
        interval_hours=float((restoration.expected_interval_hours if restoration else None) or math.inf),
        findings_sigma=tuple(
            (sigma if works[level].findings_sigma is None else works[level].findings_sigma or 0.0)
            if level in works
            else 0.0
            for level in LEVELS
        ),
        repair=turn_time("lognormal", row.repair_days_median, row.repair_days_p90),
        restoration_usd=restoration.cost_usd if restoration else 0.0,
    )


def _hazards(fleet: Fleet, module: str, engine_type: str, run: str) -> tuple[HazardSpec, ...]:
    return tuple(
        HazardSpec(
            h.cause,
            h.shape,
            h.scale if h.scale is not None else math.inf,
            h.clock == "hours",
            h.counted_from,
            h.environment_exponent,
            LEVELS.index(h.least_level),
        )
        for h in sorted(fleet.hazards, key=lambda h: h.cause)
        if h.engine_type == engine_type and h.module == module and h.run == run and h.cause != "early"
    )


def _early(fleet: Fleet, module: str, engine_type: str) -> EarlySpec | None:
    for h in fleet.hazards:
        if (h.engine_type, h.module, h.cause) == (engine_type, module, "early") and h.probability_within:
            return EarlySpec(h.probability_within, h.ends_after_cycles or 150)
    return None


def _type_spec(fleet: Fleet, number: int) -> TypeSpec:
    row = fleet.engine_types[number]
    ratings = [r for r in fleet.ratings if r.engine_type == row.engine_type]
    count = sum(m.engine_type == row.engine_type for m in fleet.module_types)
    modules = tuple(_module_spec(fleet, row.engine_type, slot) for slot in range(count))
    return TypeSpec(
        engine_type=row.engine_type,
        number=number,
        ratings=tuple(r.rating for r in ratings),
        new_margin=tuple(r.new_margin_degC for r in ratings),
        margin_spread=tuple(r.margin_spread_degC for r in ratings),
        removal_margin=row.removal_margin_degC,
        change_days=row.engine_change_days,
        fuel_kg_per_hour=row.cruise_fuel_kg_per_hour,
        modules=modules,
        core=tuple(m.slot for m in modules if m.behind and m.place == CORE_PLACE),
        spare_price_usd=row.spare_price_usd,
        down_usd_per_day=row.out_of_service_usd_per_day,
    )


def _shop_specs(fleet: Fleet, engine_type: str) -> tuple[ShopSpec, ...]:
    specs = []
    for s in fleet.shops:
        if s.engine_type != engine_type:
            continue
        turn = {
            w.visit: turn_time(s.turn_time_law, w.days_median, w.days_p90)
            for w in fleet.shop_work
            if w.shop == s.shop and w.engine_type == engine_type
        }
        specs.append(
            ShopSpec(
                s.shop,
                engine_type,
                s.inductions_per_month,
                s.module_inductions_per_month,
                s.bays,
                s.module_bays,
                s.transport_days,
                turn,
                s.contract_days,
                s.pay_days_after_release,
            )
        )
    return tuple(specs)


def _for_type(row: Strategy, kind: EngineType) -> Strategy:
    """Return a strategy with its cycles scaled for a type: long-haul types live on far fewer cycles."""
    frac = kind.build_goal_frac
    return replace(
        row,
        build_goal_cycles=max(1, round(row.build_goal_cycles * frac)),
        stub_cycles=round(row.stub_cycles * frac),
        plan_ahead_cycles=round(row.plan_ahead_cycles * frac),
    )


def setup(fleet: Fleet, strategy: str, *, horizon_days: float, sweep_days: tuple[float, ...] = ()) -> Setup:
    """Return the run-ready form of a fleet under one of its strategies.

    ``horizon_days``: days simulated from the as-of date. ``sweep_days``: further days at which life left is valued.
    Raises RequestError for a strategy that the fleet does not have or a horizon that is not above zero.
    """
    rows = {s.strategy: s for s in fleet.strategies}
    if strategy not in rows:
        raise RequestError("strategy", strategy, f"one of {', '.join(rows)}", "add it to strategies.csv")
    if not 0.0 < horizon_days <= 60 * 366:
        raise RequestError("horizon", f"{horizon_days:g} days", "more than 0 and at most 60 years")
    return Setup(
        fleet=fleet,
        strategy={t.engine_type: _for_type(rows[strategy], t) for t in fleet.engine_types},
        horizon_days=horizon_days,
        season=Season(fleet.settings.as_of, fleet.season),
        catalogue=catalogue(fleet),
        types={t.engine_type: _type_spec(fleet, i) for i, t in enumerate(fleet.engine_types)},
        parts={p.part_number: _part_spec(fleet, p.part_number) for p in fleet.part_types},
        shops={t.engine_type: _shop_specs(fleet, t.engine_type) for t in fleet.engine_types},
        teams=fleet.teams,
        market={m.engine_type: m for m in fleet.lease_market},
        washes={(w.engine_type, w.base): w for w in fleet.washes},
        environment={b.base: b.environment for b in fleet.bases},
        lessors=frozenset(lease.owner for lease in fleet.leases),
        sweep_days=tuple(sorted(d for d in sweep_days if d < horizon_days)),
    )


def _part_spec(fleet: Fleet, part_number: str) -> PartSpec:
    part = next(p for p in fleet.part_types if p.part_number == part_number)
    names = [m.module for m in fleet.module_types if m.engine_type == part.engine_type]
    return PartSpec(part_number, names.index(part.module), part.counting_rule == "most_restrictive", part.price_usd)


def hours_per_cycle(aircraft: Aircraft) -> float:
    return aircraft.hours_per_year / aircraft.cycles_per_year
