"""The reference cycles computed live with cantera: a cycle of its own, from the same words, on another gas library.

Source: cantera (frozen composition, species of NASA TM-4513 in its file nasa_gas.yaml). CHECKS asks for 0.1 % in
temperature and 0.2 % in fuel; the figures printed there are of cantera 3.2.0.
"""

from __future__ import annotations

from typing import Any

import pytest

from sim.cycle_design import designed
from sim.cycle_inputs import GasPath
from sim.cycle_rules import CUSTOMARY

ct = pytest.importorskip("cantera")

AIR = {"N2": 0.780840, "O2": 0.209476, "Ar": 0.009365, "CO2": 0.000319}
HYDROGEN = 23.0 / 12.0
HEAT, SHAFT = 43.1e6, 0.995
NGV, COOL_HPT, COOL_LPT = 0.08, 0.05, 0.02

POINTS: dict[str, dict[str, float]] = {
    "A": {
        "bpr": 5.1, "fpr": 1.70, "booster": 1.5, "hpc": 10.823529, "t4": 1630.0, "thrust": 117e3,
        "e_fan": 0.90, "e_booster": 0.89, "e_hpc": 0.865, "e_hpt": 0.91, "e_lpt": 0.92,
    },
    "B": {
        "bpr": 9.0, "fpr": 1.50, "booster": 1.6, "hpc": 17.5, "t4": 1700.0, "thrust": 320e3,
        "e_fan": 0.91, "e_booster": 0.90, "e_hpc": 0.86, "e_hpt": 0.91, "e_lpt": 0.925,
    },
    "C": {
        "bpr": 11.0, "fpr": 1.42, "booster": 1.4, "hpc": 17.0, "t4": 1650.0, "thrust": 120e3,
        "e_fan": 0.915, "e_booster": 0.90, "e_hpc": 0.86, "e_hpt": 0.91, "e_lpt": 0.93,
    },
}  # fmt: skip


class Cantera:
    """Mass-based properties of mixtures of air and burnt fuel; sensible enthalpy above 298.15 K."""

    def __init__(self) -> None:
        wanted = ("N2", "O2", "Ar", "CO2", "H2O")
        species = [s for s in ct.Species.list_from_file("nasa_gas.yaml") if s.name in wanted]
        self.phase = ct.Solution(thermo="ideal-gas", species=species)
        self.zero: dict[float, float] = {}
        air_kg = sum(x * self._molar(name) for name, x in AIR.items())
        fuel_kg = self._molar("CO2") - self._molar("O2") + HYDROGEN / 2 * (self._molar("H2O") - self._molar("O2") / 2)
        self.moles_per_ratio = air_kg / fuel_kg

    def _molar(self, name: str) -> float:
        return float(self.phase.molecular_weights[self.phase.species_index(name)])

    def set(self, ratio: float, **state: tuple[float, float]) -> None:
        burnt = ratio * self.moles_per_ratio
        moles = dict(AIR)
        moles["CO2"] += burnt
        moles["H2O"] = burnt * HYDROGEN / 2
        moles["O2"] -= burnt * (1 + HYDROGEN / 4)
        if ratio not in self.zero:
            self.phase.TPX = 298.15, 101_325.0, moles
            self.zero[ratio] = self.phase.enthalpy_mass
        self.phase.TPX = 1000.0, 101_325.0, moles
        for name, pair in state.items():
            setattr(self.phase, name, pair)

    def at(self, ratio: float, temperature: float, pressure: float) -> tuple[float, float]:
        self.set(ratio, TP=(temperature, pressure))
        return self.phase.enthalpy_mass - self.zero[ratio], self.phase.entropy_mass

    def at_enthalpy(self, ratio: float, enthalpy: float, pressure: float) -> float:
        self.set(ratio)
        self.phase.HP = enthalpy + self.zero[ratio], pressure
        return float(self.phase.T)

    def at_entropy(self, ratio: float, entropy: float, pressure: float) -> tuple[float, float]:
        self.set(ratio)
        self.phase.SP = entropy, pressure
        return float(self.phase.T), float(self.phase.enthalpy_mass - self.zero[ratio])


def compress(gas: Any, inlet: tuple[float, float], ratio: float, efficiency: float) -> tuple[float, float, float]:
    """Return temperature, pressure and work."""
    enthalpy, entropy = gas.at(0.0, *inlet)
    _, ideal = gas.at_entropy(0.0, entropy, inlet[1] * ratio)
    work = (ideal - enthalpy) / efficiency
    return gas.at_enthalpy(0.0, enthalpy + work, inlet[1] * ratio), inlet[1] * ratio, work


def expand(
    gas: Any, ratio: float, inlet: tuple[float, float], work: float, efficiency: float
) -> tuple[float, float, float]:
    """Return temperature, pressure and enthalpy behind a turbine; the pressure is searched by halving."""
    enthalpy, entropy = gas.at(ratio, *inlet)
    low, high = inlet[1] / 100.0, inlet[1]
    for _ in range(60):
        middle = (low * high) ** 0.5
        _, ideal = gas.at_entropy(ratio, entropy, middle)
        low, high = (middle, high) if enthalpy - ideal > work / efficiency else (low, middle)
    return gas.at_enthalpy(ratio, enthalpy - work, low), low, enthalpy - work


def fuel_ratio(gas: Any, h3: float, t4: float, p4: float) -> float:
    """Return the fuel-air ratio of the combustor by substitution; it converges by a factor of thirty a step."""
    ratio = 0.02
    for _ in range(12):
        h4, _ = gas.at(ratio, t4, p4)
        ratio = (h4 * (1 + ratio) - h3) / HEAT
    return ratio


def cycle(p: dict[str, float]) -> dict[str, float]:
    """Return the reference figures for one kilogram of core air: take-off static, standard day, by CHECKS' words."""
    gas, ambient = Cantera(), 101_325.0
    t13, p13, fan = compress(gas, (288.15, ambient), p["fpr"], p["e_fan"])
    t25, p25, booster = compress(gas, (t13, p13), p["booster"], p["e_booster"])
    t3, p3, hpc = compress(gas, (t25, p25), p["hpc"], p["e_hpc"])
    h3, _ = gas.at(0.0, t3, p3)
    p4, burning = p3 * 0.95, 1.0 - NGV - COOL_HPT - COOL_LPT
    ratio = fuel_ratio(gas, h3, p["t4"], p4)
    fuel = burning * ratio
    h4, _ = gas.at(ratio, p["t4"], p4)

    def mixed(flow: float, enthalpy: float, air: float) -> tuple[float, float, float]:
        """Return flow, enthalpy and fuel-air ratio after cooling air has joined."""
        both = flow + air
        return both, (flow * enthalpy + air * h3) / both, fuel / (both - fuel)

    flow, h41, ratio = mixed(burning + fuel, h4, NGV)
    t41 = gas.at_enthalpy(ratio, h41, p4)
    _, p45, h44 = expand(gas, ratio, (t41, p4), hpc / SHAFT / flow, p["e_hpt"])
    flow, h45, ratio = mixed(flow, h44, COOL_HPT)
    t45 = gas.at_enthalpy(ratio, h45, p45)
    low_work = (booster + (1 + p["bpr"]) * fan) / SHAFT / flow
    _, p5, h5 = expand(gas, ratio, (t45, p45), low_work, p["e_lpt"])
    flow, h5, ratio = mixed(flow, h5, COOL_LPT)
    t5 = gas.at_enthalpy(ratio, h5, p5)

    def jet(fuel_air: float, inlet: tuple[float, float]) -> float:
        """Return the velocity of a nozzle that is not choked, m/s."""
        enthalpy, entropy = gas.at(fuel_air, *inlet)
        _, static = gas.at_entropy(fuel_air, entropy, ambient)
        return 0.99 * (2.0 * (enthalpy - static)) ** 0.5

    thrust = flow * jet(ratio, (t5, p5 * 0.99)) + p["bpr"] * jet(0.0, (t13, p13 * 0.985))
    return {"t3": t3, "t45": t45, "t5": t5, "p45": p45, "p5": p5, "sfc": fuel / thrust * 1e6}


@pytest.mark.parametrize("name", POINTS)
def test_the_design_point_agrees_with_a_cycle_on_cantera(name: str) -> None:
    p = POINTS[name]
    theirs = cycle(p)
    efficiencies = {"fan": "e_fan", "middle": "e_booster", "hpc": "e_hpc", "hpt": "e_hpt", "lpt": "e_lpt"}
    values: dict[str, Any] = {**CUSTOMARY, **{f"{part}_efficiency": p[key] for part, key in efficiencies.items()}}
    path: GasPath[float] = GasPath(
        spools=2,
        exhaust="separate",
        **values,
        thrust_N=p["thrust"],
        bypass_ratio=p["bpr"],
        fan_pressure_ratio=p["fpr"],
        middle_pressure_ratio=p["booster"],
        hpc_pressure_ratio=p["hpc"],
        turbine_entry_K=p["t4"],
    )
    done = designed(path).walk
    turbines = done.turbines
    ours = {
        "t3": done.compressors.hpc.outlet.temperature[0],
        "t45": turbines.lpt_inlet.temperature[0],
        "t5": turbines.lpt_exit.temperature[0],
        "p45": turbines.lpt_inlet.pressure[0],
        "p5": turbines.lpt_exit.pressure[0],
        "sfc": done.fuel_flow[0] / path.thrust_N * 1e6,
    }
    for key, share in {"t3": 1e-3, "t45": 1e-3, "t5": 1e-3, "p45": 2e-3, "p5": 2e-3, "sfc": 2e-3}.items():
        assert ours[key] == pytest.approx(theirs[key], rel=share)


# CHECKS, as printed there: the cycle of this file must itself land on them, or it would check nothing.
@pytest.mark.parametrize(
    ("name", "t3", "t45", "t5", "sfc"),
    [
        ("A", 800.363, 1178.395, 864.680, 10.2159),
        ("B", 899.712, 1155.833, 778.028, 7.71005),
        ("C", 845.788, 1134.617, 760.608, 7.15817),
    ],
)
def test_the_cycle_on_cantera_lands_on_the_printed_figures(
    name: str, t3: float, t45: float, t5: float, sfc: float
) -> None:
    theirs = cycle(POINTS[name])
    assert theirs["t3"] == pytest.approx(t3, abs=0.01)
    assert theirs["t45"] == pytest.approx(t45, abs=0.02)
    assert theirs["t5"] == pytest.approx(t5, abs=0.02)
    assert theirs["sfc"] == pytest.approx(sfc, abs=5e-4)


@pytest.mark.parametrize(("kelvin", "enthalpy"), [(600.0, 308_889), (1000.0, 747_933), (1500.0, 1_336_469)])
def test_air_on_cantera_lands_on_the_printed_figures(kelvin: float, enthalpy: float) -> None:
    assert Cantera().at(0.0, kelvin, 101_325.0)[0] == pytest.approx(enthalpy, abs=5.0)
