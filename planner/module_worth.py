"""What a module's condition is worth: a restoration's degrees and fuel a year, and a spare module on an engine.

A module's loss is the measured one (``margin_lost_degC``) or the formula of its wear; it is counted at the rating of
the aircraft that flies it. Fuel is the wear table's share of cruise fuel a degree, or the influence matrix's where the
table has none. Money is at the fleet's fuel price today, for one engine and a year of its flying, not discounted.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from typing import NamedTuple

from sim.errors import RequestError
from sim.fleet import Aircraft, Engine, EngineType, Fleet, Module, WearRow
from sim.wear import derate_factor, gained, wear_law

FuelShare = Callable[[str, str, str], float]
"""From type, rating and module to the share of cruise fuel for a degree lost, where the wear table has none."""


class Condition(NamedTuple):
    """A module on its engine: degrees lost at the aircraft's rating, of them never restored, and fuel a degree."""

    module: Module
    tail: str
    rating: str
    lost_degC: float
    stays_degC: float
    fuel_frac_per_degC: float
    hours_per_year: float
    cruise_fuel_kg_per_hour: float

    def fuel_kg_per_year(self, degrees: float) -> float:
        """Return the fuel in kg that so many degrees cost in a year of the aircraft's flying."""
        return degrees * self.fuel_frac_per_degC * self.cruise_fuel_kg_per_hour * self.hours_per_year


class Restoration(NamedTuple):
    """What restoring one module of a type brings, the mean over those that fly; ``cost_usd`` with opening it."""

    engine_type: str
    module: str
    level: str
    flying: int
    lost_degC: float
    regained_degC: float
    cost_usd: float
    usd_per_degC: float | None
    fuel_kg_per_year: float
    fuel_usd_per_year: float


class Exchange(NamedTuple):
    """What one spare module does on one engine: margin before and after, and fuel."""

    engine_serial: str
    tail: str
    rating: str
    module: str
    module_off: str
    module_on: str
    margin_before_degC: float
    margin_after_degC: float
    gained_degC: float
    fuel_kg_per_year: float
    fuel_usd_per_year: float


def no_fuel(engine_type: str, rating: str, module: str) -> float:
    """Return nothing, for fleets whose wear table is all there is."""
    del engine_type, rating, module
    return 0.0


class _Index:
    """Rows of a fleet by what names them."""

    __slots__ = ("engines", "environment", "fleet", "fuel", "kinds", "margins", "modules", "tails", "wear")

    def __init__(self, fleet: Fleet, fuel: FuelShare) -> None:
        self.fleet, self.fuel = fleet, fuel
        self.kinds: Mapping[str, EngineType] = {row.engine_type: row for row in fleet.engine_types}
        self.engines: Mapping[str, Engine] = {row.engine_serial: row for row in fleet.engines}
        self.modules: Mapping[str, Module] = {row.module_serial: row for row in fleet.modules}
        self.tails: Mapping[str, Aircraft] = {row.tail: row for row in fleet.aircraft}
        self.wear: Mapping[tuple[str, str, str], WearRow] = {
            (row.engine_type, row.rating, row.module): row for row in fleet.wear
        }
        self.margins = {(row.engine_type, row.rating): row.new_margin_degC for row in fleet.ratings}
        self.environment = {row.base: row.environment for row in fleet.bases}

    def condition(self, module: Module, aircraft: Aircraft) -> Condition:
        """Return the module as it would be on that aircraft."""
        kind = self.kinds[module.engine_type]
        row = self.wear.get((module.engine_type, aircraft.rating, module.module))
        stays = 0.0 if row is None or module.first_run else row.unrecoverable_degC
        lost = module.margin_lost_degC
        if lost is None:
            lost = 0.0 if row is None else stays + self._by_formula(module, aircraft, kind, row)
        share = row.fuel_frac_per_degC if row is not None else 0.0
        return Condition(
            module,
            aircraft.tail,
            aircraft.rating,
            lost,
            min(stays, lost),
            share or self.fuel(module.engine_type, aircraft.rating, module.module),
            aircraft.hours_per_year,
            kind.cruise_fuel_kg_per_hour,
        )

    def _by_formula(self, module: Module, aircraft: Aircraft, kind: EngineType, row: WearRow) -> float:
        """Return the expected loss since the last restoration, degC."""
        law = wear_law(
            early_loss_degC=row.early_loss_degC,
            early_scale_cycles=row.early_scale_cycles,
            loss_degC_per_1000_cycles=row.loss_degC_per_1000_cycles,
            loss_degC_per_1000_hours=row.loss_degC_per_1000_hours,
            unrecoverable_degC=row.unrecoverable_degC,
            fuel_frac_per_degC=row.fuel_frac_per_degC,
        )
        factor = self.environment.get(aircraft.base, 1.0) * derate_factor(
            reference_frac=kind.reference_derate_frac,
            average_frac=aircraft.average_derate_frac,
            wear_frac_per_derate_frac=kind.wear_frac_per_derate_frac,
        )
        hours = aircraft.hours_per_year / aircraft.cycles_per_year if aircraft.cycles_per_year else 0.0
        return law.unit_degC * factor * gained(law, 0.0, module.cycles_since_restoration, hours)

    def flying(self) -> list[Condition]:
        """Return every module on an aircraft in its condition, in the order of the table."""
        result = []
        for module in self.fleet.modules:
            engine = self.engines.get(module.engine_serial)
            aircraft = self.tails.get(engine.tail) if engine is not None else None
            if aircraft is not None:
                result.append(self.condition(module, aircraft))
        return result


def conditions(fleet: Fleet, *, fuel: FuelShare = no_fuel) -> list[Condition]:
    """Return every module that flies, with what it has lost and what that costs in fuel."""
    return _Index(fleet, fuel).flying()


def restorations(fleet: Fleet, *, fuel: FuelShare = no_fuel) -> list[Restoration]:
    """Return for each type, module and level that restores margin what it brings, the mean over the modules flying.

    A level gives back its share of what can come back. Types and modules that nobody flies are left out.
    """
    by_kind: dict[tuple[str, str], list[Condition]] = {}
    for condition in _Index(fleet, fuel).flying():
        by_kind.setdefault((condition.module.engine_type, condition.module.module), []).append(condition)
    result = []
    for work in fleet.work:
        found = by_kind.get((work.engine_type, work.module), [])
        if not found or work.restores_frac <= 0.0:
            continue
        gains = [work.restores_frac * (one.lost_degC - one.stays_degC) for one in found]
        regained, cost = sum(gains) / len(found), work.cost_usd + work.access_usd
        kilograms = sum(one.fuel_kg_per_year(gain) for one, gain in zip(found, gains, strict=True)) / len(found)
        result.append(
            Restoration(
                work.engine_type,
                work.module,
                work.level,
                len(found),
                sum(one.lost_degC for one in found) / len(found),
                regained,
                cost,
                cost / regained if regained > 0.0 else None,
                kilograms,
                kilograms * fleet.settings.fuel_price_usd_per_kg,
            )
        )
    return result


def spare_on_engine(fleet: Fleet, *, engine_serial: str, module_serial: str, fuel: FuelShare = no_fuel) -> Exchange:
    """Return what a spare module would do on an engine that flies: margin before and after, fuel a year.

    It does not ask whether the two may mate; that is the fit rules' answer. Raises RequestError for serials that do
    not exist, an engine that does not fly, or a module of another type.
    """
    index = _Index(fleet, fuel)
    engine, spare = index.engines.get(engine_serial), index.modules.get(module_serial)
    if engine is None:
        raise RequestError("engine serial", engine_serial, "one of the table engines")
    if spare is None:
        raise RequestError("module serial", module_serial, "one of the table modules")
    aircraft = index.tails.get(engine.tail)
    if aircraft is None:
        raise RequestError(f"engine {engine_serial}", f"place {engine.place}", "an engine on an aircraft")
    if spare.engine_type != engine.engine_type:
        raise RequestError(f"module {module_serial}", f"type {spare.engine_type}", f"type {engine.engine_type}")
    on_wing = [row for row in fleet.modules if row.engine_serial == engine_serial]
    off = next((row for row in on_wing if row.module == spare.module), None)
    if off is None or off.module_serial == module_serial:
        raise RequestError(f"engine {engine_serial}", f"no other {spare.module}", f"a {spare.module} to come off")
    states = {row.module_serial: index.condition(row, aircraft) for row in on_wing}
    margin = index.margins[engine.engine_type, aircraft.rating] - sum(one.lost_degC for one in states.values())
    before, after = states[off.module_serial], index.condition(spare, aircraft)
    gained_degC = before.lost_degC - after.lost_degC
    kilograms = after.fuel_kg_per_year(gained_degC)
    return Exchange(
        engine_serial,
        aircraft.tail,
        aircraft.rating,
        spare.module,
        off.module_serial,
        module_serial,
        margin,
        margin + gained_degC,
        gained_degC,
        kilograms,
        kilograms * fleet.settings.fuel_price_usd_per_kg,
    )
