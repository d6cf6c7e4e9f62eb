"""What the cycle model is told about a turbofan: its gas path, the condition it works at, and what its modules lost.

A class here may hold plain numbers (one engine) or arrays of shape (n,) (a stack of n engines of one architecture):
the equations are the same, and a stack costs little more than one engine.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, fields
from typing import Generic, NamedTuple, TypeVar

import numpy as np

from sim.errors import OutOfRangeError
from sim.gas import Values

Number = TypeVar("Number", float, Values)

TWO_SPOOLS, THREE_SPOOLS = 2, 3
SEPARATE, MIXED = "separate", "mixed"


@dataclass(frozen=True, slots=True, kw_only=True)
class GasPath(Generic[Number]):
    """A turbofan at its design point: rated take-off thrust, static, standard day at sea level.

    ``middle`` is the booster on the low-pressure shaft of a two-spool engine (pressure ratio 1: none) or the
    intermediate compressor of a three-spool one. Efficiencies are isentropic; losses are shares of total pressure,
    cooling flows shares of core air taken at the compressor exit. Guide-vane cooling does work in the HP turbine, the
    cooling of a rotor joins the stream behind its turbine. ``loading_slope`` is how fast a compressor's work falls
    with its flow, see sim/cycle_components.py.
    """

    spools: int
    exhaust: str
    thrust_N: Number
    bypass_ratio: Number
    fan_pressure_ratio: Number
    middle_pressure_ratio: Number
    hpc_pressure_ratio: Number
    turbine_entry_K: Number
    fan_efficiency: Number
    middle_efficiency: Number
    hpc_efficiency: Number
    combustor_efficiency: Number
    hpt_efficiency: Number
    ipt_efficiency: Number
    lpt_efficiency: Number
    combustor_loss: Number
    core_duct_loss: Number
    bypass_duct_loss: Number
    ngv_cooling: Number
    hpt_cooling: Number
    ipt_cooling: Number
    lpt_cooling: Number
    nozzle_velocity_coefficient: Number
    shaft_efficiency: Number
    fuel_heat_J_per_kg: Number
    loading_slope: Number


class Flight(NamedTuple):
    """The air around a stack of engines and their speed: K, Pa, Mach number; each of shape (n,)."""

    temperature_K: Values
    pressure_Pa: Values
    mach: Values


class Change(NamedTuple):
    """One way in which a component gets worse; what one point of it means stands in ``CHANGES``."""

    component: str
    kind: str


EFFICIENCY, FLOW_CAPACITY, PRESSURE_LOSS, THROAT_AREA = "efficiency", "flow_capacity", "pressure_loss", "throat_area"

CHANGES: tuple[Change, ...] = (
    Change("fan", EFFICIENCY),
    Change("fan", FLOW_CAPACITY),
    Change("booster", EFFICIENCY),
    Change("booster", FLOW_CAPACITY),
    Change("ipc", EFFICIENCY),
    Change("ipc", FLOW_CAPACITY),
    Change("hpc", EFFICIENCY),
    Change("hpc", FLOW_CAPACITY),
    Change("combustor", EFFICIENCY),
    Change("combustor", PRESSURE_LOSS),
    Change("hpt", EFFICIENCY),
    Change("hpt", THROAT_AREA),
    Change("ipt", EFFICIENCY),
    Change("ipt", THROAT_AREA),
    Change("lpt", EFFICIENCY),
    Change("lpt", THROAT_AREA),
)
"""Efficiency: points lost. Flow capacity: share of the compressor's flow at a speed lost. Pressure loss: points of the
combustor's total pressure more. Throat area: share by which a worn turbine nozzle has opened."""

Lost = Mapping[Change, Values]
"""What has been lost, as fractions (0.01 is one point); a change that is not named is zero."""


def changes_of(spools: int) -> tuple[Change, ...]:
    """Return the changes that an engine of that many spools can have."""
    absent = ("ipc", "ipt") if spools == TWO_SPOOLS else ("booster",)
    return tuple(change for change in CHANGES if change.component not in absent)


def middle_of(spools: int) -> str:
    """Return what the compressor between fan and HPC is called."""
    return "booster" if spools == TWO_SPOOLS else "ipc"


def stacked(paths: Sequence[GasPath[float]]) -> GasPath[Values]:
    """Return engines of one architecture as one stack. Raises ValueError when architectures differ."""
    first = paths[0]
    if any((path.spools, path.exhaust) != (first.spools, first.exhaust) for path in paths):
        raise ValueError("a stack holds engines of one architecture")
    numbers = {
        field.name: np.array([float(getattr(path, field.name)) for path in paths])
        for field in fields(GasPath)
        if field.name not in ("spools", "exhaust")
    }
    return GasPath(spools=first.spools, exhaust=first.exhaust, **numbers)


def repeated(path: GasPath[Values], times: int) -> GasPath[Values]:
    """Return the stack laid ``times`` times one behind the other, so that many small changes are one evaluation."""
    numbers = {
        field.name: np.tile(getattr(path, field.name), times)
        for field in fields(GasPath)
        if field.name not in ("spools", "exhaust")
    }
    return GasPath(spools=path.spools, exhaust=path.exhaust, **numbers)


_RANGES: tuple[tuple[str, str, float, float], ...] = (
    ("thrust_N", "rated thrust, N", 5e3, 600e3),
    ("bypass_ratio", "bypass ratio", 2.0, 15.0),
    ("fan_pressure_ratio", "fan pressure ratio", 1.1, 2.6),
    ("middle_pressure_ratio", "booster or IP compressor pressure ratio", 1.0, 15.0),
    ("hpc_pressure_ratio", "HP compressor pressure ratio", 1.5, 40.0),
    ("turbine_entry_K", "effective turbine-entry temperature, K", 1350.0, 1900.0),
    *(
        (f"{name}_efficiency", f"{name} efficiency", 0.7, 0.97)
        for name in ("fan", "middle", "hpc", "hpt", "ipt", "lpt")
    ),
    ("combustor_efficiency", "combustor efficiency", 0.9, 1.0),
    ("combustor_loss", "combustor pressure loss", 0.0, 0.15),
    ("core_duct_loss", "core duct loss", 0.0, 0.1),
    ("bypass_duct_loss", "bypass duct loss", 0.0, 0.1),
    *((f"{name}_cooling", f"{name} cooling air", 0.0, 0.2) for name in ("ngv", "hpt", "ipt", "lpt")),
    ("nozzle_velocity_coefficient", "nozzle velocity coefficient", 0.9, 1.0),
    ("shaft_efficiency", "shaft efficiency", 0.9, 1.0),
    ("fuel_heat_J_per_kg", "lower heating value, J/kg", 40e6, 46e6),
    ("loading_slope", "slope of the compressor characteristic", 0.2, 20.0),
)

OVERALL_RANGE = (10.0, 60.0)
"""Overall pressure ratio that the model answers for."""


def check_path(path: GasPath[float]) -> None:
    """Raise OutOfRangeError for the first input outside the range in which the model may answer."""
    if path.spools not in (TWO_SPOOLS, THREE_SPOOLS):
        raise OutOfRangeError("spools", str(path.spools), "2 or 3")
    if path.exhaust not in (SEPARATE, MIXED):
        raise OutOfRangeError("exhaust", path.exhaust, "separate or mixed")
    for name, label, low, high in _RANGES:
        value = getattr(path, name)
        if not low <= value <= high:
            raise OutOfRangeError(label, f"{value:g}", f"{low:g} to {high:g}")
    overall = path.fan_pressure_ratio * path.middle_pressure_ratio * path.hpc_pressure_ratio
    if not OVERALL_RANGE[0] * (1 - 1e-9) <= overall <= OVERALL_RANGE[1] * (1 + 1e-9):
        raise OutOfRangeError("overall pressure ratio", f"{overall:g}", "10 to 60")
    if path.spools == THREE_SPOOLS and path.middle_pressure_ratio < 1.2:
        raise OutOfRangeError("IP compressor pressure ratio", f"{path.middle_pressure_ratio:g}", "1.2 to 15")
