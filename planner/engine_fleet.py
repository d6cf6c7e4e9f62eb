"""The question ``engine`` asked of a fleet's folder: the types' tables, what their modules are worth, and one spare."""

from __future__ import annotations

from pathlib import Path
from typing import Any, NamedTuple

from planner.assemble import assemble
from planner.checks.rules import check
from planner.engine import answer, fuel_share, models
from planner.gas_paths import rows_of
from planner.module_worth import Restoration, restorations, spare_on_engine
from planner.records import Records
from sim.errors import RecordsError

DEMO = "DEMO: the fleet is invented"

_TABLES = ("engine_types", "ratings", "cycles", "module_types")


class FleetAnswer(NamedTuple):
    """Result tables by name, sentences on what restores best, what was assumed, and the records' fingerprint."""

    tables: dict[str, list[dict[str, Any]]]
    sentences: list[str]
    warnings: list[str]
    inputs: str


def ask(
    fleet: Path, *, engine_type: str | None = None, spare: str | None = None, engine_serial: str | None = None
) -> FleetAnswer:
    """Return the answer for a folder or workbook.

    Raises RecordsError with every problem that stops the work, RequestError for a type or serial that is not there,
    OutOfRangeError and NoSolutionError where a gas path cannot be computed.
    """
    records, found = check(fleet)
    stopping = tuple(problem for problem in found if problem.severity == "stops")
    if stopping:
        raise RecordsError(stopping)
    return of_records(records, engine_type=engine_type, spare=spare, engine_serial=engine_serial)


def of_records(
    records: Records, *, engine_type: str | None = None, spare: str | None = None, engine_serial: str | None = None
) -> FleetAnswer:
    """Return the answer for records without problems that stop; raises as ``ask`` does."""
    rows = {name: rows_of(records, name) for name in _TABLES}
    known, refused = models(rows, engine_type=engine_type)
    result = answer(known, module_types=rows["module_types"])
    fleet, share = assemble(records), fuel_share(known)
    names = {one.cycle.engine_type for one in known}
    worth = [row for row in restorations(fleet, fuel=share) if row.engine_type in names]
    tables: dict[str, list[dict[str, Any]]] = {
        "stations": result.stations,
        "coefficients": result.coefficients,
        "ratings": result.ratings,
        "ambient": result.ambient,
        "restorations": [row._asdict() for row in worth],
        "spare_on_engine": [],
    }
    if spare is not None and engine_serial is not None:
        exchange = spare_on_engine(fleet, engine_serial=engine_serial, module_serial=spare, fuel=share)
        tables["spare_on_engine"].append(exchange._asdict())
    demo = [DEMO] if fleet.settings.demo else []
    return FleetAnswer(tables, best_sentences(worth), [*demo, *refused, *result.warnings], records.fingerprint)


def best_sentences(worth: list[Restoration]) -> list[str]:
    """Return for each type which restoration buys most degrees, and most fuel, for its price."""
    sentences = []
    for name in dict.fromkeys(row.engine_type for row in worth):
        rows = [row for row in worth if row.engine_type == name and row.regained_degC > 0.0 and row.cost_usd > 0.0]
        if not rows:
            continue
        by_heat = max(rows, key=lambda row: row.regained_degC / row.cost_usd)
        by_fuel = max(rows, key=lambda row: row.fuel_usd_per_year / row.cost_usd)
        sentences.append(
            f"Type {name}: most degrees for its price, {by_heat.module} ({by_heat.level}, "
            f"{by_heat.regained_degC:.1f} degC for {by_heat.cost_usd:,.0f} USD); most fuel for its price, "
            f"{by_fuel.module} ({by_fuel.level}, {by_fuel.fuel_usd_per_year:,.0f} USD a year for "
            f"{by_fuel.cost_usd:,.0f} USD)."
        )
    return sentences
