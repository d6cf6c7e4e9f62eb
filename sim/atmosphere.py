"""The international standard atmosphere up to 20 km, and the air that meets an engine in flight.

Source: ISO 2533:1975 (equal to the ICAO and US 1976 standard atmospheres below 20 km): temperature falls by 6.5 K a
kilometre of geopotential height to 11 km and is constant from there; pressure follows from hydrostatics.
"""

from __future__ import annotations

import math
from typing import NamedTuple

from sim.errors import OutOfRangeError

SEA_LEVEL_K, SEA_LEVEL_PA = 288.15, 101_325.0
LAPSE_K_PER_M = 0.0065
TROPOPAUSE_M = 11_000.0
GRAVITY = 9.80665
"""m/s2, the standard's."""

AIR_GAS_CONSTANT = 287.05287
"""J/(kg K), the standard's; the gas model's own differs in the sixth digit and is used for everything else."""


class Ambient(NamedTuple):
    """Still air around an engine: temperature in K, pressure in Pa."""

    temperature_K: float
    pressure_Pa: float


def standard_air(height_m: float, *, warmer_K: float = 0.0) -> Ambient:
    """Return the air at a geopotential height (-500 to 20,000 m), ``warmer_K`` above standard.

    Pressure is the standard's also on a warm day, as pressure altitude is what is flown. Raises OutOfRangeError.
    """
    if not -500.0 <= height_m <= 20_000.0:
        raise OutOfRangeError("height", f"{height_m:g} m", "-500 to 20,000 m")
    below = min(height_m, TROPOPAUSE_M)
    temperature = SEA_LEVEL_K - LAPSE_K_PER_M * below
    pressure = SEA_LEVEL_PA * (temperature / SEA_LEVEL_K) ** (GRAVITY / (LAPSE_K_PER_M * AIR_GAS_CONSTANT))
    if height_m > TROPOPAUSE_M:
        pressure *= math.exp(-GRAVITY * (height_m - TROPOPAUSE_M) / (AIR_GAS_CONSTANT * temperature))
    return Ambient(temperature + warmer_K, pressure)
