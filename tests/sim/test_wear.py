"""Wear in closed form against slow sums, and the first crossing of a margin with teeth."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st

from sim.wear import Slope, WearLaw, cycles_to, derate_factor, gained, integral, wash_gain, wear_law

LAW = wear_law(
    early_loss_degC=6.0,
    early_scale_cycles=700.0,
    loss_degC_per_1000_cycles=1.7,
    loss_degC_per_1000_hours=0.12,
    unrecoverable_degC=9.0,
    fuel_frac_per_degC=0.0005,
)


def test_the_law_gives_the_tables_degrees() -> None:
    lost = gained(LAW, 0.0, 7000.0, 1.5) * LAW.unit_degC
    assert lost == pytest.approx(6.0 * (1 - math.exp(-10)) + 1.7 * 7.0 + 0.12 * 10.5, rel=1e-12)


@given(st.floats(0, 20000), st.floats(0, 5000), st.floats(0, 5000))
def test_losses_over_stretches_add_up(since: float, first: float, second: float) -> None:
    whole = gained(LAW, since, first + second, 1.3)
    parts = gained(LAW, since, first, 1.3) + gained(LAW, since + first, second, 1.3)
    assert whole == pytest.approx(parts, rel=1e-9, abs=1e-12)


@given(st.floats(0, 8000), st.floats(1, 8000))
def test_the_integral_is_the_sum_of_small_steps(since: float, cycles: float) -> None:
    steps = 4000
    width = cycles / steps
    slow = sum(gained(LAW, since, (i + 0.5) * width, 1.3) for i in range(steps)) * width
    assert integral(LAW, since, cycles, 1.3) == pytest.approx(slow, rel=1e-5)


@given(
    st.floats(0.5, 30),
    st.floats(50, 2000),
    st.floats(0.0005, 0.02),
    st.floats(1, 60),
    st.sampled_from([(0.0, 1.0, 0), (5.0, 300.0, 500), (4.0, 120.0, 200)]),
    st.integers(0, 199),
)
def test_the_first_crossing_is_the_first(
    amount: float, tau: float, steady: float, margin: float, wash: tuple[float, float, int], phase: int
) -> None:
    gain, half_life, every = wash
    falling = Slope(((amount, tau),), steady)
    found = cycles_to(falling, margin, gain_degC=gain, half_life=half_life, every=every, phase=phase)

    def above(cycles: int) -> float:
        extra = wash_gain(gain_degC=gain, half_life=half_life, every=every, since=phase + cycles) if every else 0.0
        return margin - falling.loss(cycles) + extra

    end = min(math.ceil(found - 1e-6), 30_000)
    # washes come on whole cycles; just before one the margin is that of the cycle's end without the new wash
    assert all(above(n) > -1e-6 for n in range(0, end, max(1, end // 500)))
    if found < 30_000:
        assert above(math.ceil(found - 1e-6)) <= 1e-6 or (every and (phase + math.ceil(found - 1e-6)) % every == 0)


def test_nothing_left_is_zero_and_no_wear_is_never() -> None:
    assert cycles_to(Slope((), 0.001), 0.0) == 0.0
    assert cycles_to(Slope((), 0.0), 10.0) == math.inf


def test_less_derate_wears_more() -> None:
    # DEMO: 2 % of wear for a point of derate less
    assert derate_factor(reference_frac=0.08, average_frac=0.07, wear_frac_per_derate_frac=2.0) == pytest.approx(1.02)


def test_a_law_without_early_loss_keeps_a_unit() -> None:
    law = WearLaw(2.0, 0.0, 700.0, 0.0005, 0.0, 0.0, 0.0)
    assert gained(law, 100.0, 1000.0, 1.0) == pytest.approx(0.5)
