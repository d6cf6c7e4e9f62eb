"""Air and frozen combustion products as a semi-perfect gas: enthalpy and entropy that depend on temperature alone.

Burning one kilogram of air with ``f`` kilograms of fuel CHn turns oxygen into CO2 and H2O, so every property of the
products, taken for one kilogram of air, is that of air plus ``f`` times a fixed difference::

    CHn + (1 + n/4) O2 -> CO2 + n/2 H2O,      y(T, f) = (y_air(T) + f dy(T)) / (1 + f)

Composition then stays as it is (frozen): dissociation below 2,000 K moves what is asked here by less than the
tolerances. All quantities are arrays of one shape; sensible enthalpy is zero at 298.15 K.

Sources: polynomials of seven coefficients for 200 to 1,000 K and above, McBride, Gordon and Reno, NASA TM-4513, 1993;
gas constant CODATA 2018; atomic weights IUPAC 2021; air as in Gordon and McBride, NASA RP-1311, 1994 (from memory; it
lands on the reference enthalpies of the tests to every digit); fuel C12H23, the common stand-in for jet fuel.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

Values = NDArray[np.float64]

GAS_CONSTANT = 8.31446261815324
"""J/(mol K), CODATA 2018."""

REFERENCE_K = 298.15
"""Temperature at which sensible enthalpy is zero, and to which the heating value of the fuel refers."""

BREAK_K = 1000.0
"""Where the two ranges of the polynomials meet."""

COLDEST_K, HOTTEST_K = 150.0, 2600.0
"""Outside these no state of a turbofan lies; a search that leaves them has lost its root."""

# Where the coefficients of each property stand in a row; the two that an inversion needs lie side by side.
_H, _CP, _PHI = slice(0, 6), slice(6, 11), slice(11, 17)
_H_AND_CP, _CP_AND_PHI = slice(0, 11), slice(6, 17)

_SMALL_STEP_K = 5e-4
_MOST_STEPS = 12

FUEL_HYDROGEN_PER_CARBON = 23.0 / 12.0

_MOLAR_KG = {"N2": 28.014e-3, "O2": 31.998e-3, "Ar": 39.95e-3, "CO2": 44.009e-3, "H2O": 18.015e-3}
_AIR_MOLE_FRACTIONS = {"N2": 0.780840, "O2": 0.209476, "Ar": 0.009365, "CO2": 0.000319}

# NASA TM-4513: a1..a5 of cp/R, a6 of h/(RT), a7 of s/R; below and above 1,000 K.
_POLYNOMIALS: dict[str, tuple[tuple[float, ...], tuple[float, ...]]] = {
    "N2": (
        (3.53100528, -1.23660987e-04, -5.02999437e-07, 2.43530612e-09, -1.40881235e-12, -1046.97628, 2.96747468),
        (2.95257626, 1.39690057e-03, -4.92631691e-07, 7.86010367e-11, -4.60755321e-15, -923.948645, 5.87189252),
    ),
    "O2": (
        (3.78245636, -2.99673415e-03, 9.847302e-06, -9.68129508e-09, 3.24372836e-12, -1063.94356, 3.65767573),
        (3.66096083, 6.56365523e-04, -1.41149485e-07, 2.05797658e-11, -1.29913248e-15, -1215.97725, 3.41536184),
    ),
    "Ar": (
        (2.5, 0.0, 0.0, 0.0, 0.0, -745.375, 4.37967491),
        (2.5, 0.0, 0.0, 0.0, 0.0, -745.375, 4.37967491),
    ),
    "CO2": (
        (2.35677352, 8.98459677e-03, -7.12356269e-06, 2.45919022e-09, -1.43699548e-13, -4.83719697e04, 9.90105222),
        (4.63659493, 2.74131991e-03, -9.95828531e-07, 1.60373011e-10, -9.16103468e-15, -4.90249341e04, -1.93534855),
    ),
    "H2O": (
        (4.19864056, -2.0364341e-03, 6.52040211e-06, -5.48797062e-09, 1.77197817e-12, -3.02937267e04, -0.849032208),
        (2.67703787, 2.97318329e-03, -7.7376969e-07, 9.44336689e-11, -4.26900959e-15, -2.98858938e04, 6.88255571),
    ),
}


def _rows(a: Values) -> Values:
    """Return the 17 coefficients of one range for h (6), cp (5) and phi (4 powers, constant, logarithm)."""
    a1, a2, a3, a4, a5, a6, a7 = a
    return np.array([a5 / 5, a4 / 4, a3 / 3, a2 / 2, a1, a6, a5, a4, a3, a2, a1, a5 / 4, a4 / 3, a3 / 2, a2, a7, a1])


def _cp(c: Values, t: Values | float) -> Values:
    value: Values = (((c[0] * t + c[1]) * t + c[2]) * t + c[3]) * t + c[4]
    return value


def _h(c: Values, t: Values | float) -> Values:
    value: Values = ((((c[0] * t + c[1]) * t + c[2]) * t + c[3]) * t + c[4]) * t + c[5]
    return value


def _phi(c: Values, t: Values | float) -> Values:
    value: Values = (((c[0] * t + c[1]) * t + c[2]) * t + c[3]) * t + c[4] + c[5] * np.log(t)
    return value


def _both_ranges(weights: dict[str, float]) -> Values:
    """Return the coefficients, shape (2, 17), of a weighted sum of species in J/(kg K) and J/kg.

    Enthalpy is set to zero at 298.15 K, and both integrals are made continuous where the ranges meet: the printed
    coefficients leave a step there (some 1e-6) in which an inversion would find no root.
    """
    low, high = (
        _rows(sum((w * np.array(_POLYNOMIALS[name][part]) for name, w in weights.items()), np.zeros(7)))
        for part in (0, 1)
    )
    low[5] -= _h(low[_H], REFERENCE_K)
    high[5] += _h(low[_H], BREAK_K) - _h(high[_H], BREAK_K)
    high[15] += _phi(low[_PHI], BREAK_K) - _phi(high[_PHI], BREAK_K)
    return np.stack([low, high])


def _air() -> tuple[Values, float]:
    """Return air's coefficients and gas constant, J/(kg K)."""
    total = sum(_AIR_MOLE_FRACTIONS.values())
    molar_kg = sum(x * _MOLAR_KG[name] for name, x in _AIR_MOLE_FRACTIONS.items()) / total
    per_kg = GAS_CONSTANT / molar_kg
    return _both_ranges({name: x / total * per_kg for name, x in _AIR_MOLE_FRACTIONS.items()}), per_kg


def _burning() -> tuple[Values, float]:
    """Return what one kilogram of fuel adds to the coefficients and the gas constant of the air it burns in."""
    n = FUEL_HYDROGEN_PER_CARBON
    carbon_kg = _MOLAR_KG["CO2"] - _MOLAR_KG["O2"]
    hydrogen_kg = _MOLAR_KG["H2O"] - 0.5 * _MOLAR_KG["O2"]
    per_kg = GAS_CONSTANT / (carbon_kg + 0.5 * n * hydrogen_kg)
    moles = {"CO2": 1.0, "H2O": 0.5 * n, "O2": -(1.0 + 0.25 * n)}
    return _both_ranges({name: x * per_kg for name, x in moles.items()}), sum(moles.values()) * per_kg


_AIR_ROWS, _AIR_R = _air()
_FUEL_ROWS, _FUEL_R = _burning()


@dataclass(frozen=True, slots=True, kw_only=True)
class Gas:
    """A stream's properties: ``rows`` of shape (2, 17, n) and ``gas_constant`` in J/(kg K), shape (n,)."""

    rows: Values
    gas_constant: Values

    def enthalpy(self, temperature: Values) -> Values:
        """Return the sensible enthalpy above 298.15 K, J/kg; it rises with temperature."""
        return _h(self._pick(temperature, _H), temperature)

    def heat_capacity(self, temperature: Values) -> Values:
        """Return cp, J/(kg K)."""
        return _cp(self._pick(temperature, _CP), temperature)

    def phi(self, temperature: Values) -> Values:
        """Return the entropy at the reference pressure, J/(kg K): constant ``phi - R ln p`` is an isentrope."""
        return _phi(self._pick(temperature, _PHI), temperature)

    def heat_ratio(self, temperature: Values) -> Values:
        """Return cp over cv."""
        cp = self.heat_capacity(temperature)
        return cp / (cp - self.gas_constant)

    def temperature_at_enthalpy(self, enthalpy: Values, *, near: Values) -> Values:
        """Return the temperature in K at an enthalpy; ``near`` is where the search starts."""
        return self._invert(enthalpy, near, of_phi=False)

    def temperature_at_phi(self, phi: Values, *, near: Values) -> Values:
        """Return the temperature in K at an entropy function; ``near`` is where the search starts."""
        return self._invert(phi, near, of_phi=True)

    def isentropic_temperature(self, temperature: Values, *, pressure_ratio: Values) -> Values:
        """Return the temperature after a change of pressure (out over in) at constant entropy, K."""
        log = np.log(pressure_ratio)
        exponent = log * self.gas_constant
        half_way = temperature * np.exp(0.5 * exponent / self.heat_capacity(temperature))
        near = temperature * np.exp(exponent / self.heat_capacity(half_way))
        return self.temperature_at_phi(self.phi(temperature) + exponent, near=near)

    def _pick(self, temperature: Values, part: slice) -> Values:
        return np.where(temperature < BREAK_K, self.rows[0, part], self.rows[1, part])

    def _invert(self, wanted: Values, near: Values, *, of_phi: bool) -> Values:
        """Newton's rule on a rising function; not a number where no temperature in the range fits.

        One bad engine must not stop a stack of good ones, hence no error here: whoever solves the cycle refuses.
        """
        temperature = np.minimum(np.maximum(near, COLDEST_K), HOTTEST_K)
        step = np.zeros_like(temperature)
        for _ in range(_MOST_STEPS):
            if of_phi:
                rows = self._pick(temperature, _CP_AND_PHI)
                step = (wanted - _phi(rows[5:], temperature)) * temperature / _cp(rows[:5], temperature)
            else:
                rows = self._pick(temperature, _H_AND_CP)
                step = (wanted - _h(rows[:6], temperature)) / _cp(rows[6:], temperature)
            temperature = np.minimum(np.maximum(temperature + step, COLDEST_K), HOTTEST_K)
            # The rule converges quadratically: after a step of half a millikelvin some 1e-10 K are left.
            if not np.fmax.reduce(np.abs(step)) > _SMALL_STEP_K:
                break
        return np.where(np.abs(step) <= _SMALL_STEP_K, temperature, np.nan)


def products(fuel_air_ratio: Values) -> Gas:
    """Return the gas after burning ``fuel_air_ratio`` kilograms of fuel in one kilogram of air, shape (n,).

    Not a number where there is no such gas: a negative ratio, or more fuel than the oxygen burns.
    """
    possible = (fuel_air_ratio >= 0.0) & (fuel_air_ratio <= STOICHIOMETRIC)
    ratio = np.where(possible, fuel_air_ratio, np.nan)
    return Gas(
        rows=(_AIR_ROWS[:, :, None] + _FUEL_ROWS[:, :, None] * ratio) / (1.0 + ratio),
        gas_constant=(_AIR_R + _FUEL_R * ratio) / (1.0 + ratio),
    )


def air(count: int) -> Gas:
    """Return air for a stack of ``count`` engines."""
    return products(np.zeros(count))


def burnt_fuel_ratio(*, inlet_enthalpy: Values, outlet_K: Values, heat_J_per_kg: Values) -> Values:
    """Return the fuel-air ratio that heats air from an enthalpy to a temperature.

    Energy, for one kilogram of air: ``h_in + f q = h_air(T) + f dh(T)``, linear in f; ``q`` is the heating value times
    the share of it that is released, and the fuel arrives at 298.15 K.
    """
    below = outlet_K < BREAK_K
    of_air = _h(np.where(below, _AIR_ROWS[0, _H, None], _AIR_ROWS[1, _H, None]), outlet_K)
    of_fuel = _h(np.where(below, _FUEL_ROWS[0, _H, None], _FUEL_ROWS[1, _H, None]), outlet_K)
    return (of_air - inlet_enthalpy) / (heat_J_per_kg - of_fuel)


def _stoichiometric() -> float:
    """Return the fuel-air ratio that burns all oxygen."""
    n = FUEL_HYDROGEN_PER_CARBON
    fuel_kg = _MOLAR_KG["CO2"] - _MOLAR_KG["O2"] + 0.5 * n * (_MOLAR_KG["H2O"] - 0.5 * _MOLAR_KG["O2"])
    air_kg = sum(x * _MOLAR_KG[name] for name, x in _AIR_MOLE_FRACTIONS.items())
    return _AIR_MOLE_FRACTIONS["O2"] * fuel_kg / ((1.0 + 0.25 * n) * air_kg)


STOICHIOMETRIC = _stoichiometric()
