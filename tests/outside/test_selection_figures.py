"""Published figures of selecting the best of several simulated systems."""

from __future__ import annotations

from planner.select_best import second_stage_runs, share_of_runs, survivors

# M. Rossetti, the KSL book, section 5.7: four systems, ten runs each under common random numbers.
FOUR = (
    (63.72, 32.24, 40.28, 36.94, 36.29, 56.94, 34.10, 63.36, 49.29, 87.20),
    (63.06, 31.78, 40.32, 37.71, 36.79, 57.93, 33.39, 62.92, 47.67, 80.79),
    (57.74, 29.65, 36.52, 35.71, 33.81, 51.54, 31.39, 57.24, 42.63, 67.27),
    (62.63, 31.56, 39.87, 37.35, 36.65, 57.15, 33.30, 62.21, 47.46, 79.60),
)


def test_two_stage_selection_asks_for_45_runs() -> None:
    """Difference that does not matter 2, promise 95 %."""
    assert second_stage_runs(FOUR, delta=2.0) == 45


def test_only_the_third_system_survives_the_screening() -> None:
    """Same section, screening procedures: means 50.04, 49.24, 44.35, 48.78; smaller is better."""
    assert survivors(FOUR) == (2,)


def test_fifty_runs_are_shared_as_published() -> None:
    """Chen and Lee, *Stochastic Simulation Optimization*, p. 49: means 1 to 5, variances 1 1 9 9 4."""
    assert share_of_runs((1, 2, 3, 4, 5), (1, 1, 9, 9, 4), budget=50) == (11, 9, 19, 9, 2)
