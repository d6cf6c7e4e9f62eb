"""The standard atmosphere against its published figures."""

from __future__ import annotations

import pytest

from sim.atmosphere import standard_air
from sim.errors import OutOfRangeError


# ISO 2533:1975; the same by the package ambiance 1.3.1 (CHECKS).
@pytest.mark.parametrize(
    ("height", "kelvin", "pascal"),
    [(0.0, 288.15, 101_325.0), (5_000.0, 255.650, 54_019.9), (11_000.0, 216.650, 22_632.0)],
)
def test_the_standard_figures_are_met(height: float, kelvin: float, pascal: float) -> None:
    air = standard_air(height)
    assert air.temperature_K == pytest.approx(kelvin, abs=5e-4)
    assert air.pressure_Pa == pytest.approx(pascal, abs=0.05)


@pytest.mark.parametrize("height", [0.0, 1_000.0, 5_000.0, 10_668.0, 11_000.0, 15_000.0])
def test_an_independent_package_agrees(height: float) -> None:
    ambiance = pytest.importorskip("ambiance")
    # The package counts geometric height; the standard's figures are of geopotential height.
    other = ambiance.Atmosphere(ambiance.Atmosphere.geop2geom_height(height))
    air = standard_air(height)
    assert air.temperature_K == pytest.approx(float(other.temperature[0]), rel=1e-6)
    assert air.pressure_Pa == pytest.approx(float(other.pressure[0]), rel=1e-5)


def test_a_warm_day_keeps_its_pressure() -> None:
    assert standard_air(0.0, warmer_K=15.0) == (303.15, 101_325.0)


@pytest.mark.parametrize("height", [-501.0, 20_001.0])
def test_a_height_outside_the_standard_is_refused(height: float) -> None:
    with pytest.raises(OutOfRangeError, match="height: found"):
        standard_air(height)
