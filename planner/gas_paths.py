"""From the tables ``engine_types``, ``cycles`` and ``ratings`` to a gas path that the cycle model can work with.

Cells are read as they stand in checked rows: a blank is None (or not a number) and is filled by a documented rule of
``sim/cycle_rules.py``, which the answer then names.
"""

from __future__ import annotations

import math
import re
from collections.abc import Mapping, Sequence
from typing import Any, NamedTuple

from planner.records import Records
from sim.cycle_inputs import MIXED, SEPARATE, THREE_SPOOLS, TWO_SPOOLS, GasPath, middle_of
from sim.cycle_rules import gas_path
from sim.errors import OutOfRangeError, RequestError
from sim.influence import LPT_INLET, Conditions

Row = Mapping[str, Any]

ZERO_DEGC_K = 273.15

# Column of the table `cycles`, field of the gas path, factor to the field's unit.
_COLUMNS: tuple[tuple[str, str, float], ...] = (
    ("fan_pressure_ratio", "fan_pressure_ratio", 1.0),
    ("turbine_entry_K", "turbine_entry_K", 1.0),
    *(
        (f"{name}_efficiency_frac", f"{name}_efficiency", 1.0)
        for name in ("fan", "hpc", "combustor", "hpt", "ipt", "lpt")
    ),
    ("combustor_loss_frac", "combustor_loss", 1.0),
    ("core_duct_loss_frac", "core_duct_loss", 1.0),
    ("bypass_duct_loss_frac", "bypass_duct_loss", 1.0),
    *((f"{name}_cooling_frac", f"{name}_cooling", 1.0) for name in ("ngv", "hpt", "ipt", "lpt")),
    ("nozzle_velocity_coefficient", "nozzle_velocity_coefficient", 1.0),
    ("shaft_efficiency_frac", "shaft_efficiency", 1.0),
    ("fuel_lhv_MJ_per_kg", "fuel_heat_J_per_kg", 1e6),
)

_COMPONENTS: dict[str, tuple[str, ...]] = {
    "fan": ("fan",),
    "booster": ("booster",),
    "lpc": ("booster",),
    "ipc": ("ipc",),
    "hpc": ("hpc",),
    "combustor": ("combustor",),
    "burner": ("combustor",),
    "hpt": ("hpt",),
    "ipt": ("ipt",),
    "lpt": ("lpt",),
    "core": ("hpc", "combustor", "hpt"),
}


class TypeCycle(NamedTuple):
    """An engine type as the cycle model sees it; thrust is that of the highest rating."""

    engine_type: str
    path: GasPath[float]
    station: str
    given: frozenset[str]
    corner_point_K: float
    warnings: tuple[str, ...]


def rows_of(records: Records, table: str) -> list[dict[str, Any]]:
    """Return a table's rows as mappings by column."""
    columns = records[table].columns
    return [dict(zip(columns, values, strict=True)) for values in zip(*columns.values(), strict=True)]


def cell(row: Row, name: str) -> float | None:
    """Return a number of a row, or None where the cell is blank."""
    value = row.get(name)
    if value is None or value == "":
        return None
    number = float(value)
    return None if math.isnan(number) else number


def word(row: Row, name: str, *, blank: str) -> str:
    """Return a word of a row, or what a blank cell means."""
    value = row.get(name)
    return value if isinstance(value, str) and value else blank


def type_cycle(engine_type: Row, *, cycle: Row | None, ratings: Sequence[Row]) -> TypeCycle:
    """Return a type's gas path; without a row in ``cycles`` everything comes from bypass and pressure ratio.

    Raises RequestError where bypass or overall pressure ratio or every rating is missing, OutOfRangeError and
    NoSolutionError where the model may not or cannot answer.
    """
    name, cells = str(engine_type["engine_type"]), cycle or {}
    known, overall = _known(engine_type, cells, ratings=ratings)
    spools = int(cell(cells, "spools") or TWO_SPOOLS)
    exhaust = word(cells, "exhaust", blank=SEPARATE)
    fuel = cell(cells, "takeoff_fuel_kg_per_s")
    filled = gas_path(known, overall_pressure_ratio=overall, spools=spools, exhaust=exhaust, takeoff_fuel_kg_per_s=fuel)
    why = "no row in cycles" if cycle is None else "blank cells of cycles"
    warnings = [f"type {name}, {why}, by rule: {'; '.join(filled.assumed)}"] if filled.assumed else []
    if exhaust == MIXED:
        warnings.append(
            f"type {name}: mixed exhaust is modelled by mean total pressure; its coefficients are less sure"
        )
    corner = cell(engine_type, "corner_point_degC")
    return TypeCycle(
        name,
        filled.path,
        word(cells, "egt_station", blank=LPT_INLET),
        filled.given,
        (30.0 if corner is None else corner) + ZERO_DEGC_K,
        tuple(warnings),
    )


def _known(engine_type: Row, cells: Row, *, ratings: Sequence[Row]) -> tuple[dict[str, float], float]:
    """Return the fields of the gas path that the tables give, and the overall pressure ratio."""
    name = str(engine_type["engine_type"])
    bypass, overall = cell(engine_type, "bypass_ratio"), cell(engine_type, "overall_pressure_ratio")
    for value, column in ((bypass, "bypass_ratio"), (overall, "overall_pressure_ratio")):
        if value is None:
            raise RequestError(
                f"type {name}, {column}",
                "a blank cell",
                "a number",
                "fill it in engine_types to have the cycle computed",
            )
    thrusts = [float(row["thrust_kN"]) for row in ratings if row["engine_type"] == name]
    if not thrusts:
        raise RequestError(f"type {name}, ratings", "no row", "at least one rating with its thrust")
    assert bypass is not None
    assert overall is not None
    known = {"bypass_ratio": bypass, "thrust_N": 1000.0 * max(thrusts)}
    for column, field, factor in _COLUMNS:
        value = cell(cells, column)
        if value is not None:
            known[field] = value * factor
    three = int(cell(cells, "spools") or TWO_SPOOLS) == THREE_SPOOLS
    middle = "ipc" if three else "booster"
    for column, field in (
        (f"{middle}_efficiency_frac", "middle_efficiency"),
        (f"{middle}_pressure_ratio", "middle_pressure_ratio"),
    ):
        value = cell(cells, column)
        if value is not None:
            known[field] = value
    return known, overall


def conditions_of(cycle: TypeCycle, *, thrust_kN: float) -> Conditions:
    """Return the conditions of a rating: the type's corner point, and its share of the highest rating's thrust.

    Cruise is flown at the same thrust whatever the take-off rating.
    """
    return Conditions(corner_point_K=cycle.corner_point_K, takeoff_thrust_frac=1000.0 * thrust_kN / cycle.path.thrust_N)


def components_of(module: str, *, spools: int) -> tuple[str, ...]:
    """Return the components of the gas path that a module of that name holds; none for a gearbox.

    The name is read word by word: ``fan-booster`` holds fan and booster, ``core`` HPC, combustor and HPT.
    """
    present = {"fan", middle_of(spools), "hpc", "combustor", "hpt", "lpt"} | (
        {"ipt"} if spools == THREE_SPOOLS else set()
    )
    words = re.split(r"[^a-z]+", module.lower())
    found = [component for part in words for component in _COMPONENTS.get(part, ())]
    return tuple(dict.fromkeys(component for component in found if component in present))


def check_station(cycle: TypeCycle, *, inlet_K: float, exit_K: float, measured_degC: float) -> str:
    """Return a sentence on how the model's EGT compares with the redline less the margin of a new engine.

    Raises OutOfRangeError where the measured EGT lies nearer to the other station than to the stated one: then it
    cannot belong to it, and every margin would be misread.
    """
    measured = measured_degC + ZERO_DEGC_K
    own, other = (inlet_K, exit_K) if cycle.station == LPT_INLET else (exit_K, inlet_K)
    if abs(measured - other) < abs(measured - own):
        raise OutOfRangeError(
            f"type {cycle.engine_type}, EGT at {cycle.station}",
            f"{measured_degC:.0f} degC (redline less new margin)",
            f"about {own - ZERO_DEGC_K:.0f} degC there; {other - ZERO_DEGC_K:.0f} degC would be the other station",
            "check egt_station, redline_degC and new_margin_degC",
        )
    return (
        f"type {cycle.engine_type}: EGT at {cycle.station} on the corner-point day is {own - ZERO_DEGC_K:.0f} degC in "
        f"the model, {measured_degC:.0f} by redline and new margin; a probe reads its own mean: differences count"
    )
