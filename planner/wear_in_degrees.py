"""Wear given as lost efficiency, converted once to degrees of margin and fuel by the influence matrix.

The simulation knows wear in degC only. A row of ``wear`` that fills the columns in efficiency is converted at its
rating: loss in degC = loss in points x degC a point, and fuel a degree from the same matrix. A row in degC stays.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace
from typing import Any

from planner.gas_paths import Row, cell, components_of, conditions_of, rows_of, type_cycle
from planner.records import Records
from sim.effect import degC_per_point
from sim.errors import RequestError
from sim.influence import POINT, Matrix, influence

# Column in efficiency, and the column in degrees that it becomes.
PAIRS: tuple[tuple[str, str], ...] = (
    ("early_loss_eff_frac", "early_loss_degC"),
    ("eff_frac_per_1000_cycles", "loss_degC_per_1000_cycles"),
    ("eff_frac_per_1000_hours", "loss_degC_per_1000_hours"),
    ("unrecoverable_eff_frac", "unrecoverable_degC"),
)


def in_degrees(records: Records) -> tuple[Records, tuple[str, ...]]:
    """Return records whose table ``wear`` is all in degrees, and sentences on what was assumed for it."""
    wear = rows_of(records, "wear")
    if not any(is_in_efficiency(row) for row in wear):
        return records, ()
    converted, assumed = wear_in_degrees(
        wear,
        engine_types=rows_of(records, "engine_types"),
        cycles=rows_of(records, "cycles"),
        ratings=rows_of(records, "ratings"),
    )
    table = records["wear"]
    columns = {name: [row[name] for row in converted] for name in table.columns}
    return replace(records, tables={**records.tables, "wear": replace(table, columns=columns)}), assumed


def is_in_efficiency(row: Row) -> bool:
    """Return whether a row of the table ``wear`` gives its loss in efficiency."""
    return any(cell(row, efficiency) is not None for efficiency, _ in PAIRS)


def wear_in_degrees(
    wear: Sequence[Row], *, engine_types: Sequence[Row], cycles: Sequence[Row], ratings: Sequence[Row]
) -> tuple[list[dict[str, Any]], tuple[str, ...]]:
    """Return the rows of ``wear`` all in degrees, and sentences on what was assumed for it.

    No cycle is computed where no row is in efficiency. Raises RequestError where a row gives its loss both ways or its
    module has nothing to do with EGT, and whatever the cycle of its type raises.
    """
    matrices: dict[tuple[str, str], Matrix] = {}
    assumed: dict[str, None] = {}
    result = []
    for row in wear:
        if not is_in_efficiency(row):
            result.append(dict(row))
            continue
        key = (str(row["engine_type"]), str(row["rating"]))
        if key not in matrices:
            matrices[key], sentences = _matrix(key, engine_types=engine_types, cycles=cycles, ratings=ratings)
            assumed.update(dict.fromkeys(sentences))
        result.append(_converted(row, matrices[key]))
    return result, tuple(assumed)


def _matrix(
    key: tuple[str, str], *, engine_types: Sequence[Row], cycles: Sequence[Row], ratings: Sequence[Row]
) -> tuple[Matrix, tuple[str, ...]]:
    """Return the matrix of a type at a rating."""
    name, rating = key
    kind = next(row for row in engine_types if row["engine_type"] == name)
    cycle = type_cycle(kind, cycle=_row_of(cycles, name), ratings=ratings)
    thrust = next(float(r["thrust_kN"]) for r in ratings if r["engine_type"] == name and r["rating"] == rating)
    matrix = influence(
        cycle.path, conditions=conditions_of(cycle, thrust_kN=thrust), station=cycle.station, given=cycle.given
    )
    return matrix, cycle.warnings


def _row_of(rows: Sequence[Row], engine_type: str) -> Row | None:
    return next((row for row in rows if row["engine_type"] == engine_type), None)


def _converted(row: Row, matrix: Matrix) -> dict[str, Any]:
    """Return one row in degrees; its columns in efficiency are kept beside, as they were written."""
    where = f"wear of {row['module']}, type {row['engine_type']} at {row['rating']}"
    in_degrees = [degrees for _, degrees in PAIRS if cell(row, degrees)]
    if in_degrees:
        raise RequestError(
            where, f"efficiency and {', '.join(in_degrees)}", "one of the two", "blank the other columns"
        )
    components = components_of(str(row["module"]), spools=matrix.path.spools)
    if not components:
        raise RequestError(where, "a module outside the gas path", "a module of the gas path", "give its wear in degC")
    per_point = degC_per_point(matrix, components, flow_frac_per_eff_frac=cell(row, "flow_frac_per_eff_frac") or 0.0)
    result = dict(row)
    for efficiency, degrees in PAIRS:
        result[degrees] = (cell(row, efficiency) or 0.0) / POINT * per_point.degC
    if not cell(row, "fuel_frac_per_degC"):
        result["fuel_frac_per_degC"] = per_point.fuel_frac_per_degC
    return result
