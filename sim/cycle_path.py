"""The walk through a turbofan from intake to nozzles at given pressure ratios, airflow and turbine-entry temperature.

The walk satisfies energy and mass in every component by itself; what it does not know is whether the flow fits the
turbines' throats and the nozzles: sim/cycle_design.py reads their areas from it, sim/cycle_offdesign.py makes them fit.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from sim.cycle_components import Compression, Expansion, Jet, Stream, burn, compress, cooled, expand, jet
from sim.cycle_inputs import (
    EFFICIENCY,
    MIXED,
    PRESSURE_LOSS,
    THREE_SPOOLS,
    Change,
    Flight,
    GasPath,
    Lost,
    middle_of,
)
from sim.gas import Values, air, products


class Point(NamedTuple):
    """Where the engine works: what the walk is given. Each of shape (n,); airflow is kg/s through the fan."""

    fan_pressure_ratio: Values
    middle_pressure_ratio: Values
    hpc_pressure_ratio: Values
    turbine_entry_K: Values
    bypass_ratio: Values
    airflow: Values


class Compressors(NamedTuple):
    """The cold side; ``flight_speed`` in m/s. The core passes the fan's hub at the fan's own pressure ratio."""

    flight_speed: Values
    intake: Stream
    fan: Compression
    middle: Compression
    hpc: Compression


class Turbines(NamedTuple):
    """The hot side; of two spools the intermediate turbine does nothing."""

    combustor_exit: Stream
    hpt_inlet: Stream
    hpt: Expansion
    ipt_inlet: Stream
    ipt: Expansion
    lpt_inlet: Stream
    lpt: Expansion
    lpt_exit: Stream


class Exhaust(NamedTuple):
    """Streams at the nozzles' entry and the jets; a mixed engine has one jet, and its bypass jet is empty."""

    core: Stream
    bypass: Stream
    core_jet: Jet
    bypass_jet: Jet


class Walk(NamedTuple):
    """The whole gas path at one point of work."""

    compressors: Compressors
    turbines: Turbines
    exhaust: Exhaust

    @property
    def fuel_flow(self) -> Values:
        """Fuel burnt, kg/s."""
        return self.turbines.combustor_exit.fuel

    @property
    def net_thrust(self) -> Values:
        """Gross thrust of the jets less the momentum of the air taken in, N."""
        drag = self.compressors.intake.flow * self.compressors.flight_speed
        return self.exhaust.core_jet.gross_thrust + self.exhaust.bypass_jet.gross_thrust - drag


def walk(path: GasPath[Values], point: Point, *, flight: Flight, lost: Lost) -> Walk:
    """Return the state at every station; not a number where a component cannot do what is asked of it."""
    cold = _compressors(path, point, flight=flight, lost=lost)
    hot = _turbines(path, point, cold=cold, lost=lost)
    return Walk(cold, hot, _exhaust(path, cold=cold, hot=hot, flight=flight))


def _worn(efficiency: Values, component: str, lost: Lost) -> Values:
    return efficiency - lost.get(Change(component, EFFICIENCY), np.zeros(1))


def _intake(airflow: Values, flight: Flight) -> tuple[Values, Stream]:
    """Return the flight speed and the air brought to rest without loss."""
    gas = air(airflow.shape[0])
    static = flight.temperature_K
    speed = flight.mach * np.sqrt(gas.heat_ratio(static) * gas.gas_constant * static)
    enthalpy = gas.enthalpy(static) + 0.5 * speed * speed
    total = gas.temperature_at_enthalpy(enthalpy, near=static * (1.0 + 0.2 * flight.mach * flight.mach))
    pressure = flight.pressure_Pa * np.exp((gas.phi(total) - gas.phi(static)) / gas.gas_constant)
    return speed, Stream(airflow, np.zeros_like(airflow), total, pressure, enthalpy, gas)


def _compressors(path: GasPath[Values], point: Point, *, flight: Flight, lost: Lost) -> Compressors:
    speed, intake = _intake(point.airflow, flight)
    fan = compress(intake, pressure_ratio=point.fan_pressure_ratio, efficiency=_worn(path.fan_efficiency, "fan", lost))
    core = fan.outlet._replace(flow=point.airflow / (1.0 + point.bypass_ratio))
    middle_efficiency = _worn(path.middle_efficiency, middle_of(path.spools), lost)
    middle = compress(core, pressure_ratio=point.middle_pressure_ratio, efficiency=middle_efficiency)
    hpc = compress(
        middle.outlet,
        pressure_ratio=point.hpc_pressure_ratio,
        efficiency=_worn(path.hpc_efficiency, "hpc", lost),
    )
    return Compressors(speed, intake, fan, middle, hpc)


def _turbines(path: GasPath[Values], point: Point, *, cold: Compressors, lost: Lost) -> Turbines:
    """Return the hot side: each turbine gives what its compressors take, over the shaft's own efficiency."""
    core, delivered = cold.middle.outlet.flow, cold.hpc.outlet

    def with_air(stream: Stream, share: Values) -> Stream:
        return cooled(stream, air_flow=core * share, air_enthalpy=delivered.enthalpy)

    # All cooling air leaves behind the HP compressor; what is left goes through the combustor.
    cooling = path.ngv_cooling + path.hpt_cooling + path.lpt_cooling
    if path.spools == THREE_SPOOLS:
        cooling = cooling + path.ipt_cooling
    burnt = burn(
        delivered._replace(flow=core * (1.0 - cooling)),
        outlet_K=point.turbine_entry_K,
        efficiency=_worn(path.combustor_efficiency, "combustor", lost),
        pressure_loss=path.combustor_loss + lost.get(Change("combustor", PRESSURE_LOSS), np.zeros(1)),
        heat=path.fuel_heat_J_per_kg,
    )
    hp_power = core * cold.hpc.work / path.shaft_efficiency
    middle_power = core * cold.middle.work / path.shaft_efficiency
    lp_power = point.airflow * cold.fan.work / path.shaft_efficiency

    hpt_inlet = with_air(burnt, path.ngv_cooling)
    hpt = expand(hpt_inlet, power=hp_power, efficiency=_worn(path.hpt_efficiency, "hpt", lost))
    ipt_inlet = with_air(hpt.outlet, path.hpt_cooling)
    if path.spools == THREE_SPOOLS:
        ipt = expand(ipt_inlet, power=middle_power, efficiency=_worn(path.ipt_efficiency, "ipt", lost))
        lpt_inlet = with_air(ipt.outlet, path.ipt_cooling)
    else:
        ipt, lpt_inlet = Expansion(ipt_inlet, np.ones_like(core)), ipt_inlet
        lp_power = lp_power + middle_power
    lpt = expand(lpt_inlet, power=lp_power, efficiency=_worn(path.lpt_efficiency, "lpt", lost))
    return Turbines(burnt, hpt_inlet, hpt, ipt_inlet, ipt, lpt_inlet, lpt, with_air(lpt.outlet, path.lpt_cooling))


def _exhaust(path: GasPath[Values], *, cold: Compressors, hot: Turbines, flight: Flight) -> Exhaust:
    core = hot.lpt_exit._replace(pressure=hot.lpt_exit.pressure * (1.0 - path.core_duct_loss))
    behind_fan = cold.fan.outlet
    bypass = behind_fan._replace(
        flow=behind_fan.flow - cold.middle.outlet.flow, pressure=behind_fan.pressure * (1.0 - path.bypass_duct_loss)
    )
    coefficient = path.nozzle_velocity_coefficient
    if path.exhaust == MIXED:
        only = jet(_mixed(core, bypass), back_pressure=flight.pressure_Pa, velocity_coefficient=coefficient)
        return Exhaust(core, bypass, only, only._replace(gross_thrust=np.zeros_like(core.flow)))
    core_jet, bypass_jet = (
        jet(stream, back_pressure=flight.pressure_Pa, velocity_coefficient=coefficient) for stream in (core, bypass)
    )
    return Exhaust(core, bypass, core_jet, bypass_jet)


def _mixed(core: Stream, bypass: Stream) -> Stream:
    """Return core and bypass fully mixed: energy is kept, total pressure is the mean by flow (a simplification)."""
    flow = core.flow + bypass.flow
    gas = products(core.fuel / (flow - core.fuel))
    enthalpy = (core.flow * core.enthalpy + bypass.flow * bypass.enthalpy) / flow
    near = (core.flow * core.temperature + bypass.flow * bypass.temperature) / flow
    temperature = gas.temperature_at_enthalpy(enthalpy, near=near)
    pressure = (core.flow * core.pressure + bypass.flow * bypass.pressure) / flow
    return Stream(flow, core.fuel, temperature, pressure, enthalpy, gas)
