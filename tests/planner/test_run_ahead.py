"""Expected runs against closed forms."""

import math

import pytest

from planner.picture import picture
from planner.run_ahead import chance_of_no_removal, expected_run_cycles
from tests.sim.builders import exponential_removals, tiny_fleet


def test_an_exponential_cause_has_its_closed_form() -> None:
    """With rate r an hour, one hour a cycle: S = exp(-r c), expected run (1 - exp(-r n)) / r."""
    view = picture(exponential_removals(tiny_fleet(), per_hour=0.002))
    engine, flying = view.engine("E1"), view.tails["A1"].flying
    assert chance_of_no_removal(engine.modules, flying, cycles=300) == pytest.approx(math.exp(-0.6))
    expected = (1 - math.exp(-0.002 * 1000)) / 0.002
    assert expected_run_cycles(engine.modules, flying, planned_cycles=1000) == pytest.approx(expected, rel=1e-6)


def test_without_chance_causes_the_run_is_the_planned_one() -> None:
    view = picture(tiny_fleet())
    flying = view.tails["A1"].flying
    assert expected_run_cycles(view.engine("E1").modules, flying, planned_cycles=1000) == pytest.approx(1000)
    assert expected_run_cycles(view.engine("E1").modules, flying, planned_cycles=0) == 0
