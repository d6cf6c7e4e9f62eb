"""The influence matrix of an engine type: what one point lost in each component costs in EGT and fuel, and how surely.

The off-design engine is a root ``R(x, p) = 0`` of unknowns x for what is lost p. By implicit differentiation

    dy/dp = y_p - y_x R_x^-1 R_p

for every outcome y (EGT, fuel), with all partial slopes from one evaluation of the cycle for a stack of small changes.
EGT is taken at the corner-point day at the rating's full thrust, fuel there and in cruise; thrust is held.

Bands: each input that is not known exactly is moved up and down by its uncertainty, and the moves of a coefficient are
added as a root of squares; a share of the coefficient is added the same way for what the model leaves out.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import NamedTuple

import numpy as np

from sim.atmosphere import SEA_LEVEL_K, standard_air
from sim.cycle_design import Engine, design, faults
from sim.cycle_inputs import Change, Flight, GasPath, changes_of, stacked
from sim.cycle_offdesign import UNKNOWNS, Operating, at, misfit, solve, tiled
from sim.cycle_path import walk
from sim.errors import NoSolutionError
from sim.gas import Values

LPT_INLET, LPT_EXIT = "lpt_inlet", "lpt_exit"
STATIONS = (LPT_INLET, LPT_EXIT)

POINT = 0.01
MODEL_SHARE_EGT, MODEL_SHARE_FUEL, MODEL_SHARE_AMBIENT = 0.30, 0.12, 0.10
"""Share of a coefficient that the model may be off by: the root-mean-square difference to an open-source cycle with
component maps of its own (tests/outside/test_open_cycle_library.py, sim/METHOD.md); for ambient own judgement."""

_STEP = 1e-5
_OUTCOMES = 3
"""EGT at the LP turbine's inlet and exit, and fuel."""


class Uncertain(NamedTuple):
    """An input that is not known exactly: its half-width when a rule filled it, and when the user gave it."""

    field: str
    by_rule: float
    given: float
    relative: bool


UNCERTAIN: tuple[Uncertain, ...] = (
    Uncertain("turbine_entry_K", 50.0, 20.0, False),
    Uncertain("fan_pressure_ratio", 0.06, 0.02, True),
    Uncertain("middle_pressure_ratio", 0.15, 0.03, True),
    Uncertain("fan_efficiency", 0.015, 0.005, False),
    Uncertain("hpc_efficiency", 0.02, 0.01, False),
    Uncertain("hpt_efficiency", 0.02, 0.01, False),
    Uncertain("lpt_efficiency", 0.015, 0.005, False),
    Uncertain("ngv_cooling", 0.04, 0.02, False),
    Uncertain("loading_slope", 2.0, 2.0, True),
)
"""Own judgement from the spread of published cycles; no source. The slope is never known: a third to three times."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Conditions:
    """Where the matrix is taken. Cruise: 35,000 ft, Mach 0.80, 19 % of rated thrust (customary, from memory)."""

    corner_point_K: float = SEA_LEVEL_K + 15.0
    takeoff_thrust_frac: float = 1.0
    cruise_height_m: float = 10_668.0
    cruise_mach: float = 0.80
    cruise_thrust_frac: float = 0.19


class Band(NamedTuple):
    """A figure with its band."""

    value: float
    low: float
    high: float


class Coefficient(NamedTuple):
    """What one point of a change does at constant thrust; positive is hotter or more fuel."""

    change: Change
    egt_K: Band
    egt_frac: Band
    fuel_takeoff_frac: Band
    fuel_cruise_frac: Band


@dataclass(frozen=True, slots=True, kw_only=True)
class Matrix:
    """All coefficients of one type at one rating, and the level that they belong to."""

    path: GasPath[float]
    conditions: Conditions
    station: str
    lpt_inlet_K: float
    lpt_exit_K: float
    takeoff_fuel_kg_per_s: float
    cruise_fuel_kg_per_s: float
    egt_per_ambient: Band
    egt_K_per_thrust_point: Band
    coefficients: tuple[Coefficient, ...]

    @property
    def egt_K(self) -> float:
        """EGT at the probe's station on the corner-point day."""
        return self.lpt_inlet_K if self.station == LPT_INLET else self.lpt_exit_K

    def of(self, change: Change) -> Coefficient:
        """Return the coefficient of a change; KeyError where the engine has no such component."""
        for coefficient in self.coefficients:
            if coefficient.change == change:
                return coefficient
        raise KeyError(change)


def influence(
    path: GasPath[float],
    *,
    conditions: Conditions | None = None,
    station: str = LPT_INLET,
    given: frozenset[str] = frozenset(),
) -> Matrix:
    """Return the matrix of one engine; ``given`` names inputs that did not come from a rule.

    Raises NoSolutionError where the engine has no acceptable root at take-off or in cruise.
    """
    return influences([path], conditions=[conditions or Conditions()], stations=[station], given=[given])[0]


def influences(
    paths: Sequence[GasPath[float]],
    *,
    conditions: Sequence[Conditions],
    stations: Sequence[str],
    given: Sequence[frozenset[str]],
) -> list[Matrix]:
    """Return the matrices of several engines of one architecture, solved as one stack."""
    engine = design(stacked([v for path, known in zip(paths, given, strict=True) for v in _variants(path, known)]))
    per_path = engine.count // len(paths)
    for k, why in enumerate(faults(engine)[::per_path]):
        if why:
            raise NoSolutionError(f"design point of engine {k + 1}", why)
    repeat = [condition for condition in conditions for _ in range(per_path)]
    both = tiled(engine, 2)
    flight, thrust = _flights(repeat, engine.path.thrust_N)
    state = solve(both, flight=flight, thrust_N=thrust, lost={})
    level, slope = _sensitivities(both, state, flight=flight, thrust_N=thrust)
    level = level.reshape(_OUTCOMES, 2, len(paths), per_path)
    slope = slope.reshape(_OUTCOMES, slope.shape[1], 2, len(paths), per_path)
    solved = state.solved.reshape(2, len(paths), per_path)
    for k in range(len(paths)):
        for part, name in enumerate(("take-off at the corner point", "cruise")):
            if not solved[part, k, 0]:
                raise NoSolutionError(name, f"the engine has no acceptable root there (engine {k + 1})")
    return [
        _matrix(path, conditions[k], station=stations[k], level=level[:, :, k], slope=slope[:, :, :, k])
        for k, path in enumerate(paths)
    ]


def _variants(path: GasPath[float], given: frozenset[str]) -> list[GasPath[float]]:
    """Return the engine itself, then each uncertain input up and down; the overall pressure ratio is kept."""
    result = [path]
    for name, by_rule, known, relative in UNCERTAIN:
        value = getattr(path, name)
        width = known if name in given else by_rule
        for sign in (1.0, -1.0):
            moved = value * (1.0 + width) ** sign if relative else value + sign * width
            if name.endswith("_pressure_ratio"):
                moved = max(moved, 1.0)
            hpc = path.hpc_pressure_ratio * (value / moved if name.endswith("_pressure_ratio") else 1.0)
            result.append(replace(path, **{name: moved, "hpc_pressure_ratio": hpc}))
    return result


def _flights(conditions: Sequence[Conditions], thrust_N: Values) -> tuple[Flight, Values]:
    """Return air, speed and thrust of the stack at take-off, then of the stack in cruise."""
    ground = standard_air(0.0)
    cruise = [standard_air(c.cruise_height_m) for c in conditions]
    flight = Flight(
        np.array([c.corner_point_K for c in conditions] + [air.temperature_K for air in cruise]),
        np.array([ground.pressure_Pa] * len(conditions) + [air.pressure_Pa for air in cruise]),
        np.array([0.0] * len(conditions) + [c.cruise_mach for c in conditions]),
    )
    shares = np.array([[c.takeoff_thrust_frac for c in conditions], [c.cruise_thrust_frac for c in conditions]])
    return flight, (shares * thrust_N).ravel()


def _sensitivities(engine: Engine, state: Operating, *, flight: Flight, thrust_N: Values) -> tuple[Values, Values]:
    """Return the outcomes (3, n) and their total slopes (3, changes + 2, n); the last two: ambient in K, ln thrust."""
    changes, count = changes_of(engine.path.spools), engine.count
    copies = 1 + UNKNOWNS + len(changes) + 2

    def one(copy: int, base: Values | float, step: float) -> Values:
        """Return a quantity that is moved in one copy of the stack only."""
        values = np.tile(np.broadcast_to(base, (count,)), (copies, 1)).astype(float)
        values[copy] += step
        return values.ravel()

    steps = np.log(np.stack(state.point) / np.stack(engine.point))
    shifted = np.stack([one(1 + k, steps[k], _STEP) for k in range(UNKNOWNS)])
    first = 1 + UNKNOWNS
    lost = {change: one(first + k, 0.0, _STEP) for k, change in enumerate(changes)}
    warm, push = copies - 2, copies - 1
    air = Flight(one(warm, flight.temperature_K, 1e2 * _STEP), *(np.tile(value, copies) for value in flight[1:]))
    thrust = np.tile(thrust_N, (copies, 1))
    thrust[push] *= 1.0 + _STEP
    many = tiled(engine, copies)
    with np.errstate(invalid="ignore", divide="ignore"):
        done = walk(many.path, at(many, shifted), flight=air, lost=lost)
        residual = misfit(many, done, flight=air, thrust_N=thrust.ravel(), lost=lost)
        outcome = np.stack([done.turbines.lpt_inlet.temperature, done.turbines.lpt_exit.temperature, done.fuel_flow])
    residual = residual.reshape(UNKNOWNS, copies, count)
    outcome = outcome.reshape(_OUTCOMES, copies, count)
    widths = np.full(copies - 1, _STEP)
    widths[warm - 1] = 1e2 * _STEP
    residual_slope = (residual[:, 1:] - residual[:, :1]) / widths[:, None]
    outcome_slope = (outcome[:, 1:] - outcome[:, :1]) / widths[:, None]
    by_unknown = np.moveaxis(residual_slope[:, :UNKNOWNS], 2, 0)
    by_change = np.moveaxis(residual_slope[:, UNKNOWNS:], 2, 0)
    usable = np.isfinite(by_unknown).all(axis=(1, 2)) & state.solved
    response = -np.linalg.solve(np.where(usable[:, None, None], by_unknown, np.eye(UNKNOWNS)), by_change)
    response = np.where(usable[:, None, None], response, np.nan)
    total = outcome_slope[:, UNKNOWNS:] + np.einsum("ykn,nkp->ypn", outcome_slope[:, :UNKNOWNS], response)
    return outcome[:, 0], total


def _matrix(path: GasPath[float], conditions: Conditions, *, station: str, level: Values, slope: Values) -> Matrix:
    """Return the matrix from levels (3, 2, variants) and slopes (3, changes + 2, 2, variants)."""
    probe, fuel = STATIONS.index(station), 2
    egt = level[probe, 0]

    coefficients = tuple(
        Coefficient(
            change,
            _band(slope[probe, k, 0] * POINT, model=MODEL_SHARE_EGT),
            _band(slope[probe, k, 0] * POINT / egt, model=MODEL_SHARE_EGT),
            _band(slope[fuel, k, 0] * POINT / level[fuel, 0], model=MODEL_SHARE_FUEL),
            _band(slope[fuel, k, 1] * POINT / level[fuel, 1], model=MODEL_SHARE_FUEL),
        )
        for k, change in enumerate(changes_of(path.spools))
    )
    return Matrix(
        path=path,
        conditions=conditions,
        station=station,
        lpt_inlet_K=float(level[0, 0, 0]),
        lpt_exit_K=float(level[1, 0, 0]),
        takeoff_fuel_kg_per_s=float(level[fuel, 0, 0]),
        cruise_fuel_kg_per_s=float(level[fuel, 1, 0]),
        egt_per_ambient=_band(slope[probe, -2, 0], model=MODEL_SHARE_AMBIENT),
        egt_K_per_thrust_point=_band(slope[probe, -1, 0] * POINT, model=MODEL_SHARE_AMBIENT),
        coefficients=coefficients,
    )


def _band(values: Values, *, model: float) -> Band:
    """Return the first value with a band from the moves of the others, pairs of up and down.

    Where an input cannot be moved one way (no engine is left), the other way stands for both.
    """
    value = float(values[0])
    moves = (values[1:] - value).reshape(-1, 2)
    moves = np.nan_to_num(np.where(np.isnan(moves), -moves[:, ::-1], moves))
    share = model * abs(value)
    up = float(np.sqrt(np.sum(np.maximum(moves.max(axis=1), 0.0) ** 2) + share**2))
    down = float(np.sqrt(np.sum(np.minimum(moves.min(axis=1), 0.0) ** 2) + share**2))
    return Band(value, value - down, value + up)
