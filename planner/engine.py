"""The question ``engine``: a type's gas path, and what a point lost in each module costs in margin and fuel.

Works on checked rows (mappings by column), so that command, screen and report share it; the matrix is computed once
for each rating.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from typing import Any, NamedTuple

import numpy as np

from planner.gas_paths import (
    ZERO_DEGC_K,
    Row,
    TypeCycle,
    cell,
    check_station,
    components_of,
    conditions_of,
    type_cycle,
)
from sim.cycle import THRUST_RANGE, cruise, stations, takeoff
from sim.effect import degC_per_point
from sim.errors import RequestError, UserError
from sim.influence import Band, Matrix, influences
from sim.redline import hottest_ambient, takeoff_egt

Rows = Mapping[str, Sequence[Row]]

NEVER_INFERRED = "EGT and fuel cannot tell HPC from HPT wear: a module's condition is an input, never inferred"


class EngineAnswer(NamedTuple):
    """The tables of the answer, rows by column as in the schema's result tables, and what was assumed."""

    stations: list[dict[str, Any]]
    coefficients: list[dict[str, Any]]
    ratings: list[dict[str, Any]]
    ambient: list[dict[str, Any]]
    warnings: list[str]


class TypeModel(NamedTuple):
    """One type: its row, its cycle, the ratings that the model reaches (highest first) with a matrix each, the others,
    and a sentence on the level of its EGT."""

    kind: Row
    cycle: TypeCycle
    ratings: list[Row]
    left_out: list[str]
    matrices: list[Matrix]
    level: str


def chosen_types(rows: Rows, engine_type: str | None) -> list[Row]:
    """Return the type asked for, or all types. Raises RequestError for a type that the tables do not have."""
    have = [str(row["engine_type"]) for row in rows["engine_types"]]
    if engine_type is None:
        return list(rows["engine_types"])
    if engine_type not in have:
        raise RequestError("engine type", engine_type, " or ".join(have) or "a row in engine_types")
    return [row for row in rows["engine_types"] if row["engine_type"] == engine_type]


def models(rows: Rows, *, engine_type: str | None = None) -> tuple[list[TypeModel], list[str]]:
    """Return cycle and matrices of one type or all, and why any of all could not be computed.

    ``rows`` holds engine_types, ratings and perhaps cycles. Raises RequestError, OutOfRangeError or NoSolutionError
    where the type asked for, or every type, cannot be computed.
    """
    done: list[TypeModel] = []
    refused: list[UserError] = []
    for kind in chosen_types(rows, engine_type):
        try:
            done.append(_model(kind, rows))
        except UserError as error:
            refused.append(error)
    if refused and not done:
        raise refused[0]
    return done, [f"not computed: {error}" for error in refused]


def _model(kind: Row, rows: Rows) -> TypeModel:
    name = str(kind["engine_type"])
    cells = next((row for row in rows.get("cycles", ()) if row["engine_type"] == name), None)
    ratings = sorted(
        (row for row in rows["ratings"] if row["engine_type"] == name), key=lambda row: -float(row["thrust_kN"])
    )
    cycle = type_cycle(kind, cycle=cells, ratings=ratings)
    usable = [row for row in ratings if _thrust_frac(cycle, row) >= THRUST_RANGE[0]]
    left_out = [str(row["rating"]) for row in ratings if row not in usable]
    matrices = rating_matrices(cycle, usable)
    measured = float(kind["redline_degC"]) - float(ratings[0]["new_margin_degC"])
    top = matrices[0]
    level = check_station(cycle, inlet_K=top.lpt_inlet_K, exit_K=top.lpt_exit_K, measured_degC=measured)
    return TypeModel(kind, cycle, usable, left_out, matrices, level)


def answer(known: Sequence[TypeModel], *, module_types: Sequence[Row]) -> EngineAnswer:
    """Return the tables of the answer."""
    result = EngineAnswer([], [], [], [], [])
    for one in known:
        name, top = one.cycle.engine_type, one.matrices[0]
        modules = [str(row["module"]) for row in module_types if row["engine_type"] == name]
        result.stations.extend(_station_rows(one.cycle, top))
        result.coefficients.extend(coefficient_rows(top, engine_type=name, modules=modules))
        result.ratings.extend(_rating_rows(one))
        result.ambient.extend(_ambient_rows(one))
        result.warnings.extend(one.cycle.warnings)
        result.warnings.append(one.level)
        result.warnings.extend(
            f"type {name}, rating {rating}: under {THRUST_RANGE[0]:g} of the highest thrust, out of reach"
            for rating in one.left_out
        )
    result.warnings.append(NEVER_INFERRED)
    return result


def fuel_share(known: Sequence[TypeModel]) -> Callable[[str, str, str], float]:
    """Return the matrix's share of cruise fuel a degree lost, by type, rating and module; zero without one."""
    matrices = {
        (one.cycle.engine_type, str(row["rating"])): matrix
        for one in known
        for row, matrix in zip(one.ratings, one.matrices, strict=True)
    }

    def share(engine_type: str, rating: str, module: str) -> float:
        matrix = matrices.get((engine_type, rating))
        components = components_of(module, spools=matrix.path.spools) if matrix is not None else ()
        if matrix is None or not components or components == ("combustor",):
            return 0.0
        return degC_per_point(matrix, components).fuel_frac_per_degC

    return share


def rating_matrices(cycle: TypeCycle, ratings: Sequence[Row]) -> list[Matrix]:
    """Return one matrix for each rating of a type, solved as one stack."""
    count = len(ratings)
    return influences(
        [cycle.path] * count,
        conditions=[conditions_of(cycle, thrust_kN=float(row["thrust_kN"])) for row in ratings],
        stations=[cycle.station] * count,
        given=[cycle.given] * count,
    )


def _thrust_frac(cycle: TypeCycle, rating: Row) -> float:
    return 1000.0 * float(rating["thrust_kN"]) / cycle.path.thrust_N


def _station_rows(cycle: TypeCycle, top: Matrix) -> list[dict[str, Any]]:
    """Return the stations at the design point, on the corner-point day and in cruise, highest rating."""
    path, conditions = cycle.path, top.conditions
    states = {
        "take-off, standard day": takeoff(path),
        "take-off, corner point": takeoff(path, ambient_K=conditions.corner_point_K),
        "cruise": cruise(
            path,
            height_m=conditions.cruise_height_m,
            mach=conditions.cruise_mach,
            thrust_N=conditions.cruise_thrust_frac * path.thrust_N,
        ),
    }
    return [
        {"engine_type": cycle.engine_type, "condition": condition, **station._asdict()}
        for condition, state in states.items()
        for station in stations(path, state.walk)
    ]


def coefficient_rows(matrix: Matrix, *, engine_type: str, modules: Sequence[str]) -> list[dict[str, Any]]:
    """Return a row for each change of each component, under the module that holds it (else under its own name)."""
    spools = matrix.path.spools
    holder = {component: module for module in modules for component in components_of(module, spools=spools)}
    result = []
    for coefficient in matrix.coefficients:
        component = coefficient.change.component
        row: dict[str, Any] = {
            "engine_type": engine_type,
            "module": holder.get(component, component),
            "component": component,
            "change": coefficient.change.kind,
        }
        bands: dict[str, Band] = {
            "egt_K": coefficient.egt_K,
            "egt_frac": coefficient.egt_frac,
            "fuel_takeoff_frac": coefficient.fuel_takeoff_frac,
            "fuel_cruise_frac": coefficient.fuel_cruise_frac,
        }
        for name, band in bands.items():
            row |= {name: band.value, f"{name}_low": band.low, f"{name}_high": band.high}
        result.append(row)
    return result


def _rating_rows(one: TypeModel) -> list[dict[str, Any]]:
    """Return margin and hottest ambient of a new engine at each rating, by the table's slope and by the cycle's."""
    kind, ratings, matrices = one.kind, one.ratings, one.matrices
    given = cell(kind, "egt_per_ambient")
    corner = matrices[0].conditions.corner_point_K - ZERO_DEGC_K
    result = []
    for rating, matrix in zip(ratings, matrices, strict=True):
        margin, slope = float(rating["new_margin_degC"]), matrix.egt_per_ambient
        result.append(
            {
                "engine_type": kind["engine_type"],
                "rating": rating["rating"],
                "thrust_kN": float(rating["thrust_kN"]),
                "new_margin_degC": margin,
                "model_margin_degC": float(ratings[0]["new_margin_degC"]) + matrices[0].egt_K - matrix.egt_K,
                "egt_per_ambient": given if given is not None else slope.value,
                "model_egt_per_ambient": slope.value,
                "model_egt_per_ambient_low": slope.low,
                "model_egt_per_ambient_high": slope.high,
                "degC_per_thrust_point": matrix.egt_K_per_thrust_point.value,
                "hottest_ambient_degC": hottest_ambient(
                    corner_point_degC=corner, margin_degC=margin, egt_per_ambient=given or slope.value
                ),
                "model_hottest_ambient_degC": hottest_ambient(
                    corner_point_degC=corner, margin_degC=margin, egt_per_ambient=slope.value
                ),
            }
        )
    return result


def _ambient_rows(one: TypeModel) -> list[dict[str, Any]]:
    """Return the margin of a new engine against ambient temperature at each rating's full thrust."""
    ambient = np.arange(-10.0, 50.1, 5.0)
    result = []
    for rating, matrix in zip(one.ratings, one.matrices, strict=True):
        share = np.full_like(ambient, matrix.conditions.takeoff_thrust_frac)
        egt = takeoff_egt(matrix.path, station=matrix.station, ambient_K=ambient + ZERO_DEGC_K, thrust_frac=share)
        margin = float(rating["new_margin_degC"]) + matrix.egt_K - egt
        result += [
            {
                "engine_type": one.cycle.engine_type,
                "rating": rating["rating"],
                "ambient_degC": float(a),
                "margin_degC": float(m),
            }
            for a, m in zip(ambient, margin, strict=True)
        ]
    return result
