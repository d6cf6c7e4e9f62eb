"""The components of a turbofan, one function each; every quantity is an array over a stack of engines.

Sources: Walsh and Fletcher, *Gas Turbine Performance*, 2nd ed. 2004, and Saravanamuttoo et al., *Gas Turbine Theory*
(from memory) for component definitions; variable specific heats throughout, so isentropes follow the entropy function
and not a mean heat ratio.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sim.gas import Gas, Values, burnt_fuel_ratio, products

_TYPICAL_CP = 1220.0
"""J/(kg K), only to start the search for a temperature in hot gas."""


class Stream(NamedTuple):
    """A flow at a station: kg/s, of it fuel burnt kg/s, total temperature K, total pressure Pa, J/kg, and its gas."""

    flow: Values
    fuel: Values
    temperature: Values
    pressure: Values
    enthalpy: Values
    gas: Gas

    @property
    def fuel_air_ratio(self) -> Values:
        return self.fuel / (self.flow - self.fuel)


class Compression(NamedTuple):
    outlet: Stream
    work: Values
    """J/kg that the shaft gives."""
    ideal_work: Values
    """J/kg without loss."""


class Expansion(NamedTuple):
    outlet: Stream
    pressure_ratio: Values
    """In over out."""


class Jet(NamedTuple):
    velocity: Values
    """m/s, after the velocity coefficient."""
    area: Values
    """m2, effective, that passes the flow."""
    gross_thrust: Values
    """N, momentum and pressure, before the intake's drag."""
    choked: NDArray[np.bool_]


def compress(inlet: Stream, *, pressure_ratio: Values, efficiency: Values) -> Compression:
    """Return the flow behind a compressor and its work for each kilogram."""
    ideal_K = inlet.gas.isentropic_temperature(inlet.temperature, pressure_ratio=pressure_ratio)
    ideal = inlet.gas.enthalpy(ideal_K) - inlet.enthalpy
    work = ideal / efficiency
    enthalpy = inlet.enthalpy + work
    near = ideal_K + (ideal_K - inlet.temperature) * (1.0 / efficiency - 1.0)
    temperature = inlet.gas.temperature_at_enthalpy(enthalpy, near=near)
    outlet = inlet._replace(temperature=temperature, pressure=inlet.pressure * pressure_ratio, enthalpy=enthalpy)
    return Compression(outlet, work, ideal)


def burn(inlet: Stream, *, outlet_K: Values, efficiency: Values, pressure_loss: Values, heat: Values) -> Stream:
    """Return the flow behind the combustor at a given temperature; fuel is what heats it so far."""
    air = inlet.flow
    ratio = burnt_fuel_ratio(inlet_enthalpy=inlet.enthalpy, outlet_K=outlet_K, heat_J_per_kg=heat * efficiency)
    gas = products(ratio)
    fuel = ratio * air
    pressure = inlet.pressure * (1.0 - pressure_loss)
    return Stream(air + fuel, fuel, outlet_K, pressure, gas.enthalpy(outlet_K), gas)


def cooled(stream: Stream, *, air_flow: Values, air_enthalpy: Values) -> Stream:
    """Return the stream after cooling air has joined it at the stream's own pressure."""
    flow = stream.flow + air_flow
    gas = products(stream.fuel / (flow - stream.fuel))
    enthalpy = (stream.flow * stream.enthalpy + air_flow * air_enthalpy) / flow
    near = stream.temperature + (enthalpy - stream.enthalpy) / _TYPICAL_CP
    temperature = gas.temperature_at_enthalpy(enthalpy, near=near)
    return Stream(flow, stream.fuel, temperature, stream.pressure, enthalpy, gas)


def expand(inlet: Stream, *, power: Values, efficiency: Values) -> Expansion:
    """Return the flow behind an uncooled turbine that gives ``power`` (W) to its shaft."""
    work = power / inlet.flow
    ideal = work / efficiency
    near = inlet.temperature - ideal / _TYPICAL_CP
    ideal_K = inlet.gas.temperature_at_enthalpy(inlet.enthalpy - ideal, near=near)
    log_ratio = (inlet.gas.phi(inlet.temperature) - inlet.gas.phi(ideal_K)) / inlet.gas.gas_constant
    enthalpy = inlet.enthalpy - work
    near = inlet.temperature - (inlet.temperature - ideal_K) * efficiency
    temperature = inlet.gas.temperature_at_enthalpy(enthalpy, near=near)
    ratio = np.exp(log_ratio)
    outlet = inlet._replace(temperature=temperature, pressure=inlet.pressure / ratio, enthalpy=enthalpy)
    return Expansion(outlet, ratio)


def choked_throat(inlet: Stream) -> Values:
    """Return the effective throat area in m2 that passes the flow when it is choked.

    ``W sqrt(R T) / p = A sqrt(g) (2 / (g + 1))^((g + 1) / (2 (g - 1)))`` with the heat ratio g at the inlet.
    """
    g = inlet.gas.heat_ratio(inlet.temperature)
    flux = np.sqrt(g) * np.exp((g + 1.0) / (2.0 * (g - 1.0)) * np.log(2.0 / (g + 1.0)))
    area: Values = inlet.flow * np.sqrt(inlet.gas.gas_constant * inlet.temperature) / (inlet.pressure * flux)
    return area


def jet(stream: Stream, *, back_pressure: Values, velocity_coefficient: Values) -> Jet:
    """Return the jet of a convergent nozzle: expanded to the air around it, or choked with pressure left over."""
    gas, total = stream.gas, stream.temperature
    entropy = gas.phi(total)
    sonic_K = _sonic_temperature(stream)
    sonic_pressure = stream.pressure * np.exp((gas.phi(sonic_K) - entropy) / gas.gas_constant)
    full_K = gas.isentropic_temperature(total, pressure_ratio=back_pressure / stream.pressure)
    choked = sonic_pressure > back_pressure
    throat_K = np.where(choked, sonic_K, full_K)
    pressure = np.where(choked, sonic_pressure, back_pressure)
    ideal = np.sqrt(2.0 * (stream.enthalpy - gas.enthalpy(throat_K)))
    area = stream.flow * gas.gas_constant * throat_K / (pressure * ideal)
    velocity = ideal * velocity_coefficient
    return Jet(velocity, area, stream.flow * velocity + area * (pressure - back_pressure), choked)


def _sonic_temperature(stream: Stream) -> Values:
    """Return the static temperature at Mach 1: ``h0 - h(T) = g R T / 2``; three steps leave nothing."""
    gas = stream.gas
    cp = gas.heat_capacity(stream.temperature)
    g = cp / (cp - gas.gas_constant)
    temperature = 2.0 / (g + 1.0) * stream.temperature
    for _ in range(3):
        cp = gas.heat_capacity(temperature)
        half = 0.5 * gas.gas_constant * cp / (cp - gas.gas_constant)
        excess = stream.enthalpy - gas.enthalpy(temperature) - half * temperature
        temperature = temperature + excess / (cp + half)
    return temperature


def shaft_speed(*, flow: Values, work: Values, slope: Values) -> Values:
    """Return a compressor's speed over its design speed from flow and ideal work over their design values.

    The characteristic is a straight line of work coefficient over flow coefficient through the design point,
    ``psi = 1 + slope (1 - phi)`` with ``phi = flow / speed`` and ``psi = work / speed^2`` (the line of an ideal stage;
    Horlock, *Axial Flow Compressors*, 1958, from memory). ``flow`` is relative volume flow W T / p at the inlet.
    """
    half = slope * flow
    return (half + np.sqrt(half * half + 4.0 * (1.0 + slope) * work)) / (2.0 * (1.0 + slope))


def work_at_speed(*, flow: Values, speed: Values, slope: Values) -> Values:
    """Return ideal work over its design value at a flow and a speed: the same line, solved the other way."""
    return (1.0 + slope) * speed * speed - slope * flow * speed
