"""Published figures of comparing two systems by simulation.

Source: M. Rossetti, the KSL book (*Simulation Modeling using the Kotlin Simulation Library*), Table 5.5 and chapter 3.
"""

from __future__ import annotations

import pytest

from planner.sequential import paired_interval, runs_for_half_width

# Table 5.5: ten paired runs of two designs.
FIRST = (52.56, 48.77, 53.49, 50.60, 51.60, 51.77, 51.09, 53.51, 47.44, 47.94)
SECOND = (49.92, 47.08, 50.62, 48.45, 49.20, 49.33, 48.81, 50.64, 46.08, 46.45)


def test_the_paired_interval_of_the_published_ten_runs() -> None:
    """Mean 2.219, standard deviation 0.5441, 95 % interval 1.830 to 2.608 (the book's own has a rounding slip)."""
    found = paired_interval(FIRST, SECOND)
    assert found.mean == pytest.approx(2.219, abs=5e-4)
    assert found.sd == pytest.approx(0.5441, abs=5e-5)
    assert found.low == pytest.approx(1.830, abs=5e-4)
    assert found.high == pytest.approx(2.608, abs=5e-4)


@pytest.mark.parametrize(("sd", "half_width", "runs"), [(6.0, 0.1, 23_886), (4.7537, 0.5, 600)])
def test_the_runs_that_a_half_width_asks_for(sd: float, half_width: float, runs: int) -> None:
    assert runs_for_half_width(sd, half_width, level_frac=0.99) == runs
