"""Life in exact arithmetic: the worked cases, dated limits, directives, and what never happens."""

from __future__ import annotations

from fractions import Fraction

import pytest
from hypothesis import given
from hypothesis import strategies as st

from sim.fleet import PartLimit
from sim.life import change_days, cycles_left, holds_for, in_force, rows_for, used_fraction


def limit(rating: str, cycles: int, **more: object) -> PartLimit:
    return PartLimit(part_number="D1", rating=rating, limit_cycles=cycles, **more)  # type: ignore[arg-type]


# TRADE.md, "Ratings flown": limits 15,000 and 18,500; flown 6,000 and 4,000
ROWS = (limit("high", 15_000), limit("low", 18_500))
FLOWN = (("high", 6_000), ("low", 4_000))


@pytest.mark.parametrize(
    ("rating", "rule", "left"),
    [("high", "linear", 5_756), ("low", "linear", 7_100), ("low", "most_restrictive", 5_000)],
)
def test_worked_case_of_two_ratings(rating: str, rule: str, left: int) -> None:
    assert cycles_left(FLOWN, rating, ROWS, rule=rule, day=0.0) == left


def test_fraction_used_is_exact() -> None:
    assert used_fraction(FLOWN, ROWS, day=0.0) == Fraction(6_000, 15_000) + Fraction(4_000, 18_500)


def test_unknown_life_is_zero_life() -> None:
    assert cycles_left((), "high", ROWS, rule="linear", day=0.0, known=False) == 0


def test_a_rating_without_a_limit_leaves_nothing() -> None:
    assert cycles_left((("bump", 1),), "high", ROWS, rule="linear", day=0.0) == 0
    assert cycles_left((("bump", 1),), "high", ROWS, rule="most_restrictive", day=0.0) == 0
    assert cycles_left((), "bump", ROWS, rule="linear", day=0.0) == 0
    assert cycles_left((("bump", 0),), "high", ROWS, rule="linear", day=0.0) == 15_000


def test_the_latest_general_row_holds_and_the_lower_of_two_on_one_day() -> None:
    rows = (
        limit("high", 12_000),
        limit("high", 15_000, valid_from_day=10.0),
        limit("high", 14_000, valid_from_day=10.0),
        limit("high", 9_000, valid_from_day=20.0),
    )
    assert [in_force(rows, "high", day).limit_cycles for day in (0.0, 10.0, 20.0)] == [12_000, 14_000, 9_000]  # type: ignore[union-attr]
    assert change_days(rows) == (10.0, 20.0)


def test_a_directive_caps_later_general_rows_too() -> None:
    rows = (
        limit("high", 15_000),
        limit("high", 8_000, valid_from_day=5.0, directive="AD-1"),
        limit("high", 16_000, valid_from_day=9.0),
    )
    assert in_force(rows, "high", 4.0).directive == ""  # type: ignore[union-attr]
    assert in_force(rows, "high", 9.0).limit_cycles == 8_000  # type: ignore[union-attr]


def test_a_directive_on_cycles_leaves_the_limits_in_hours_and_days() -> None:
    rows = (
        limit("high", 15_000, limit_hours=30_000, limit_days=9_000),
        limit("high", 8_000, valid_from_day=0.0, directive="AD-1"),
    )
    held = in_force(rows, "high", 0.0)
    assert held is not None
    assert (held.limit_cycles, held.limit_hours, held.limit_days) == (8_000, 30_000, 9_000)


def test_a_directive_alone_publishes_no_limit() -> None:
    assert in_force((limit("high", 8_000, directive="AD-1"),), "high", 0.0) is None


@pytest.mark.parametrize(
    ("serial", "hit"),
    [("D10010", True), ("D10020", True), ("D10009", False), ("D10021", False), ("E10015", False), ("D", False)],
)
def test_a_serial_range_is_inclusive_and_keeps_its_prefix(serial: str, hit: bool) -> None:
    row = limit("high", 8_000, directive="AD-1", serial_prefix="D", serial_from=10_010, serial_to=10_020)
    assert holds_for(row, serial) is hit
    assert rows_for(serial, (*ROWS, row)) == ((*ROWS, row) if hit else ROWS)


counts = st.integers(0, 40_000)
limits = st.integers(1, 40_000)


@given(counts, counts, limits, limits, st.sampled_from(("linear", "most_restrictive")))
def test_one_more_cycle_never_adds_life_and_flying_what_is_left_never_passes_the_limit(
    high: int, low: int, high_limit: int, low_limit: int, rule: str
) -> None:
    rows = (limit("high", high_limit), limit("low", low_limit))
    left = cycles_left((("high", high), ("low", low)), "high", rows, rule=rule, day=0.0)
    assert 0 <= left <= high_limit
    assert cycles_left((("high", high), ("low", low + 1)), "high", rows, rule=rule, day=0.0) <= left
    if left:
        used = Fraction(high + left, high_limit) + Fraction(low, low_limit)
        assert rule == "most_restrictive" or used <= 1 < used + Fraction(1, high_limit)
        assert cycles_left((("high", high + left), ("low", low)), "high", rows, rule=rule, day=0.0) == 0
