"""The design point: reference cycles, balances over the whole allowed range, and refusals."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np
import pytest
from hypothesis import HealthCheck, assume, given, settings
from hypothesis import strategies as st

from sim.cycle import stations
from sim.cycle_design import design, designed, faults
from sim.cycle_inputs import GasPath, stacked
from sim.cycle_path import Walk
from sim.cycle_rules import CUSTOMARY, gas_path
from sim.errors import NoSolutionError, OutOfRangeError, UserError


def reference(name: str) -> GasPath[float]:
    """Return one of the three reference cycles (CHECKS, "The gas-turbine cycle")."""
    bypass, fan, booster, hpc, entry, thrust, efficiencies = {
        "A": (5.1, 1.70, 1.5, 10.823529, 1630.0, 117e3, (0.90, 0.89, 0.865, 0.91, 0.92)),
        "B": (9.0, 1.50, 1.6, 17.5, 1700.0, 320e3, (0.91, 0.90, 0.86, 0.91, 0.925)),
        "C": (11.0, 1.42, 1.4, 17.0, 1650.0, 120e3, (0.915, 0.90, 0.86, 0.91, 0.93)),
    }[name]
    named = zip(("fan", "middle", "hpc", "hpt", "lpt"), efficiencies, strict=True)
    values: dict[str, Any] = {**CUSTOMARY, **{f"{part}_efficiency": value for part, value in named}}
    return GasPath(
        spools=2,
        exhaust="separate",
        **values,
        thrust_N=thrust,
        bypass_ratio=bypass,
        fan_pressure_ratio=fan,
        middle_pressure_ratio=booster,
        hpc_pressure_ratio=hpc,
        turbine_entry_K=entry,
    )


# Frozen cycle with cantera 3.2.0 (CHECKS; computed live in tests/outside/test_cantera_cycle.py).
@pytest.mark.parametrize(
    ("name", "t3", "t45", "t5", "p45", "p5", "fuel", "sfc"),
    [
        ("A", 800.363, 1178.395, 864.680, 725_703, 178_860, 1.19526, 10.2159),
        ("B", 899.712, 1155.833, 778.028, 784_845, 131_174, 2.46722, 7.71005),
        ("C", 845.788, 1134.617, 760.608, 681_733, 114_398, 0.85898, 7.15817),
    ],
)
def test_the_reference_cycles_are_met(
    name: str, t3: float, t45: float, t5: float, p45: float, p5: float, fuel: float, sfc: float
) -> None:
    path = reference(name)
    done = designed(path).walk
    turbines = done.turbines
    assert done.compressors.hpc.outlet.temperature[0] == pytest.approx(t3, abs=1e-3)
    assert turbines.lpt_inlet.temperature[0] == pytest.approx(t45, abs=1e-3)
    assert turbines.lpt_exit.temperature[0] == pytest.approx(t5, abs=1e-3)
    assert turbines.lpt_inlet.pressure[0] == pytest.approx(p45, abs=1.0)
    assert turbines.lpt_exit.pressure[0] == pytest.approx(p5, abs=1.0)
    assert done.fuel_flow[0] == pytest.approx(fuel, abs=1e-5)
    assert done.fuel_flow[0] / path.thrust_N * 1e6 == pytest.approx(sfc, abs=1e-4)


def balance_errors(path: GasPath[Any], done: Walk) -> dict[str, float]:
    """Return the relative error of every component's energy and of the flow, by a bookkeeping of its own."""
    cold, hot, exhaust = done

    def power(stream: Any) -> Any:
        return stream.flow * stream.enthalpy

    core, air = cold.middle.outlet.flow, cold.intake.flow
    delivered = cold.hpc.outlet
    cooling = path.ngv_cooling + path.hpt_cooling + path.lpt_cooling
    if path.spools == 3:
        cooling = cooling + path.ipt_cooling
    heat = done.fuel_flow * path.fuel_heat_J_per_kg * path.combustor_efficiency
    fan = air * (cold.fan.outlet.enthalpy - cold.intake.enthalpy)
    middle = core * (cold.middle.outlet.enthalpy - cold.fan.outlet.enthalpy)
    high = core * (delivered.enthalpy - cold.middle.outlet.enthalpy)
    turbine = {
        "hpt": hot.hpt_inlet.flow * (hot.hpt_inlet.enthalpy - hot.hpt.outlet.enthalpy),
        "ipt": hot.ipt_inlet.flow * (hot.ipt_inlet.enthalpy - hot.ipt.outlet.enthalpy),
        "lpt": hot.lpt_inlet.flow * (hot.lpt_inlet.enthalpy - hot.lpt.outlet.enthalpy),
    }
    shafts = high + middle + fan
    leaving = power(exhaust.core) + power(exhaust.bypass)
    spools = 1.0 / path.shaft_efficiency
    errors = {
        "combustor": (power(hot.combustor_exit) - core * (1 - cooling) * delivered.enthalpy - heat) / heat,
        "hp shaft": (turbine["hpt"] - high * spools) / high,
        "lp shaft": (turbine["ipt"] + turbine["lpt"] - (fan + middle) * spools) / fan,
        "ngv mixing": (power(hot.hpt_inlet) - power(hot.combustor_exit) - core * path.ngv_cooling * delivered.enthalpy)
        / heat,
        "whole engine": (leaving - power(cold.intake) - heat + shafts * (spools - 1.0)) / heat,
        "mass": (exhaust.core.flow + exhaust.bypass.flow - air - done.fuel_flow) / air,
        "core mass": (exhaust.core.flow - core - done.fuel_flow) / core,
    }
    return {name: float(np.max(np.abs(error))) for name, error in errors.items()}


# The whole range that the model may be asked for (sim/cycle_inputs.py).
GAS_PATHS = st.fixed_dictionaries(
    {
        "thrust_N": st.floats(5e3, 600e3),
        "bypass_ratio": st.floats(2.0, 15.0),
        "turbine_entry_K": st.floats(1350.0, 1900.0),
        **{f"{name}_efficiency": st.floats(0.7, 0.97) for name in ("fan", "middle", "hpc", "hpt", "ipt", "lpt")},
        "combustor_efficiency": st.floats(0.9, 1.0),
        "combustor_loss": st.floats(0.0, 0.15),
        "core_duct_loss": st.floats(0.0, 0.1),
        "bypass_duct_loss": st.floats(0.0, 0.1),
        **{f"{name}_cooling": st.floats(0.0, 0.2) for name in ("ngv", "hpt", "ipt", "lpt")},
        "nozzle_velocity_coefficient": st.floats(0.9, 1.0),
        "shaft_efficiency": st.floats(0.9, 1.0),
        "fuel_heat_J_per_kg": st.floats(40e6, 46e6),
        "loading_slope": st.floats(0.2, 20.0),
    }
)


@settings(max_examples=15, deadline=None, suppress_health_check=[HealthCheck.filter_too_much])
@given(
    known=GAS_PATHS,
    overall=st.floats(10.0, 60.0),
    spools=st.sampled_from([2, 3]),
    exhaust=st.sampled_from(["separate", "mixed"]),
)
def test_a_design_balances_or_is_refused(known: dict[str, float], overall: float, spools: int, exhaust: str) -> None:
    try:
        path = gas_path(known, overall_pressure_ratio=overall, spools=spools, exhaust=exhaust).path
        engine = designed(path)
    except UserError:
        assume(False)
        return
    assert max(balance_errors(stacked([path]), engine.walk).values()) < 1e-9
    assert engine.walk.net_thrust[0] == pytest.approx(path.thrust_N, rel=1e-12)


@settings(max_examples=60, deadline=None)
@given(known=GAS_PATHS, overall=st.floats(10.0, 60.0), spools=st.sampled_from([2, 3]))
def test_nothing_but_an_answer_or_a_users_error_comes_out(known: dict[str, float], overall: float, spools: int) -> None:
    try:
        engine = designed(gas_path(known, overall_pressure_ratio=overall, spools=spools).path)
    except UserError:
        return
    for station in stations(engine.path, engine.walk):  # type: ignore[arg-type]
        assert np.isfinite(station.temperature_K)
        assert station.temperature_K > 200.0
        assert station.pressure_kPa > 100.0


def test_airflow_grows_with_thrust_in_proportion() -> None:
    one, two = (designed(replace(reference("A"), thrust_N=thrust)) for thrust in (50e3, 100e3))
    assert two.point.airflow[0] == pytest.approx(2.0 * one.point.airflow[0], rel=1e-12)
    assert two.walk.turbines.lpt_inlet.temperature[0] == pytest.approx(one.walk.turbines.lpt_inlet.temperature[0])


def test_three_spools_split_the_low_shaft_without_changing_the_whole() -> None:
    # Cooling and efficiencies alike, the IP turbine only takes over the middle compressor's work.
    two = reference("B")
    three = replace(two, spools=3, ipt_efficiency=two.lpt_efficiency)
    exits = [designed(path).walk.turbines.lpt_exit.temperature[0] for path in (two, three)]
    assert exits[0] == pytest.approx(exits[1], abs=1e-6)


def test_one_engine_that_cannot_be_does_not_stop_its_stack() -> None:
    good, bad = reference("A"), replace(reference("A"), fan_pressure_ratio=2.5, turbine_entry_K=1350.0)
    engine = design(stacked([good, bad]))
    assert faults(engine)[0] == ""
    assert "turbine" in faults(engine)[1]
    assert engine.walk.fuel_flow[0] == pytest.approx(1.19526, abs=1e-5)


@pytest.mark.parametrize(
    ("field", "value", "words"),
    [
        ("bypass_ratio", 1.9, "bypass ratio: found 1.9, expected 2 to 15"),
        ("bypass_ratio", 15.1, "bypass ratio"),
        ("thrust_N", 4.9e3, "rated thrust"),
        ("thrust_N", 601e3, "rated thrust"),
        ("turbine_entry_K", 1349.0, "turbine-entry temperature"),
        ("turbine_entry_K", 1901.0, "turbine-entry temperature"),
        ("hpc_pressure_ratio", 25.0, "overall pressure ratio: found 63.75"),
        ("hpc_pressure_ratio", 3.0, "overall pressure ratio"),
        ("hpt_efficiency", 0.99, "hpt efficiency"),
        ("spools", 1, "spools: found 1"),
        ("exhaust", "open", "exhaust: found open"),
        ("bypass_ratio", float("nan"), "bypass ratio: found nan"),
    ],
)
def test_an_input_outside_the_range_is_refused_by_name(field: str, value: object, words: str) -> None:
    with pytest.raises(OutOfRangeError, match=words):
        designed(replace(reference("A"), **{field: value}))  # type: ignore[arg-type]


def test_a_core_without_a_jet_is_refused() -> None:
    with pytest.raises(NoSolutionError, match="design point"):
        designed(replace(reference("C"), fan_pressure_ratio=1.9, turbine_entry_K=1400.0))
