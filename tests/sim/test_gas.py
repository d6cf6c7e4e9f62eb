"""Air and products: reference enthalpies, consistency of the properties, and inversions over the whole range."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from sim import gas

TEMPERATURES = st.floats(160.0, 2500.0)
RATIOS = st.floats(0.0, gas.STOICHIOMETRIC)


def one(value: float) -> gas.Values:
    return np.array([value])


# cantera 3.2.0 with NASA TM-4513 data, frozen air (CHECKS: "Air, J/kg above 298.15 K").
@pytest.mark.parametrize(("kelvin", "enthalpy"), [(600, 308_889), (1000, 747_933), (1500, 1_336_469)])
def test_enthalpy_of_air_lands_on_the_reference(kelvin: float, enthalpy: float) -> None:
    assert gas.air(1).enthalpy(one(kelvin))[0] == pytest.approx(enthalpy, abs=0.5)


def test_heat_capacity_of_air_lands_on_the_reference() -> None:
    assert gas.air(1).heat_capacity(one(1000.0))[0] == pytest.approx(1140.64, abs=0.005)


@pytest.mark.parametrize(("ratio", "kelvin"), [(10, 552.009), (40, 801.534)])
def test_isentropic_compression_from_the_standard_day_lands_on_the_reference(ratio: float, kelvin: float) -> None:
    found = gas.air(1).isentropic_temperature(one(288.15), pressure_ratio=one(ratio))[0]
    assert found == pytest.approx(kelvin, abs=5e-4)


def test_the_stoichiometric_ratio_of_jet_fuel_is_about_one_to_fifteen() -> None:
    # 0.0680 to 0.0685 for kerosene, any textbook of combustion (from memory).
    assert 0.0680 < gas.STOICHIOMETRIC < 0.0685


@settings(max_examples=60, deadline=None)
@given(kelvin=TEMPERATURES, ratio=RATIOS)
def test_heat_capacity_is_the_slope_of_enthalpy_and_of_entropy(kelvin: float, ratio: float) -> None:
    stream, step = gas.products(one(ratio)), 0.01
    low, high = one(kelvin - step), one(kelvin + step)
    if (low[0] - gas.BREAK_K) * (high[0] - gas.BREAK_K) < 0:
        return  # the two ranges differ by 1e-5 in slope where they meet
    cp = stream.heat_capacity(one(kelvin))[0]
    assert (stream.enthalpy(high) - stream.enthalpy(low))[0] / (2 * step) == pytest.approx(cp, rel=1e-6)
    assert (stream.phi(high) - stream.phi(low))[0] / (2 * step) == pytest.approx(cp / kelvin, rel=1e-6)


@settings(max_examples=60, deadline=None)
@given(kelvin=TEMPERATURES, near=TEMPERATURES, ratio=RATIOS)
def test_inversions_return_the_temperature_from_any_start(kelvin: float, near: float, ratio: float) -> None:
    stream = gas.products(one(ratio))
    by_h = stream.temperature_at_enthalpy(stream.enthalpy(one(kelvin)), near=one(near))[0]
    by_phi = stream.temperature_at_phi(stream.phi(one(kelvin)), near=one(near))[0]
    assert by_h == pytest.approx(kelvin, abs=1e-7)
    assert by_phi == pytest.approx(kelvin, abs=1e-7)


def test_inversions_of_a_wide_stack_leave_no_noise_that_a_solver_would_see() -> None:
    # Newton stops when the largest step is small; what the others then have left must stay under 1e-12 relative.
    kelvin = np.linspace(200.0, 2000.0, 4001)
    stream = gas.products(np.full_like(kelvin, 0.02))
    for spread in (0.05, 0.5, 5.0, 50.0):
        found = stream.temperature_at_enthalpy(stream.enthalpy(kelvin), near=kelvin + spread)
        assert np.max(np.abs(found / kelvin - 1.0)) < 2e-12


def test_an_energy_that_no_temperature_fits_is_not_a_number_and_leaves_its_neighbour_alone() -> None:
    stream = gas.air(2)
    found = stream.temperature_at_enthalpy(np.array([1e7, 308_889.36]), near=np.array([500.0, 500.0]))
    assert np.isnan(found[0])
    assert found[1] == pytest.approx(600.0, abs=1e-3)


def test_more_fuel_than_the_oxygen_burns_is_no_gas() -> None:
    assert np.isnan(gas.products(one(gas.STOICHIOMETRIC * 1.01)).gas_constant[0])
    assert np.isnan(gas.products(one(-0.001)).gas_constant[0])


@settings(max_examples=40, deadline=None)
@given(inlet=st.floats(500.0, 1100.0), rise=st.floats(50.0, 1000.0))
def test_burning_balances_energy(inlet: float, rise: float) -> None:
    heat, out = 43.1e6, one(inlet + rise)
    entering = gas.air(1).enthalpy(one(inlet))
    ratio = gas.burnt_fuel_ratio(inlet_enthalpy=entering, outlet_K=out, heat_J_per_kg=one(heat))
    leaving = (1.0 + ratio) * gas.products(ratio).enthalpy(out)
    assert leaving[0] == pytest.approx((entering + ratio * heat)[0], rel=1e-12)
