"""Lease settlements against the worked cases of TRADE.md, and what must hold for any figures."""

import pytest
from hypothesis import given
from hypothesis import strategies as st

from planner.settlement import (
    DAYS_PER_YEAR,
    Share,
    full_life,
    half_life,
    hard,
    left_frac,
    mirror,
    pay_short,
    reserve_balance,
    reserves_drawn,
)
from sim.errors import OutOfRangeError

USD = st.floats(0, 1e7)
FRAC = st.floats(0, 1)


def test_half_life_of_a_restoration_is_the_worked_case() -> None:
    """5,200 hours since restoration of 9,000 expected, 3.26 M USD: 254 thousand to pay (TRADE.md, Lease returns)."""
    left = left_frac(5_200, expected_interval=9_000)
    assert round(left, 3) == 0.422
    assert round(half_life([Share(left, 3_260_000)]), -3) == -254_000


def test_half_life_of_a_part_is_the_worked_case() -> None:
    """4,388 of 15,000 cycles left at 460 thousand USD: 95 thousand to pay (TRADE.md, Lease returns)."""
    left = left_frac(15_000 - 4_388, expected_interval=15_000)
    assert round(left, 4) == 0.2925
    assert round(half_life([Share(left, 460_000)]), -3) == -95_000


def test_half_life_adds_up_over_its_events() -> None:
    shares = [Share(left_frac(5_200, expected_interval=9_000), 3_260_000), Share(4_388 / 15_000, 460_000)]
    assert half_life(shares) == pytest.approx(-253_555.56 - 95_434.67, abs=0.01)


def test_mirror_over_12000_cycles_is_the_worked_case() -> None:
    """12,000 cycles at 30.67 USD: 368 thousand to pay (TRADE.md, Lease returns)."""
    paid = mirror(3_000, left_at_delivery=15_000, usd_per_unit=30.67, two_way=False)
    assert paid == pytest.approx(-368_040)
    assert mirror(3_000, left_at_delivery=15_000, usd_per_unit=30.67, two_way=True) == paid


def test_only_a_two_way_mirror_pays_the_operator() -> None:
    assert mirror(9_000, left_at_delivery=7_500, usd_per_unit=20, two_way=True) == 30_000
    assert mirror(9_000, left_at_delivery=7_500, usd_per_unit=20, two_way=False) == 0


def test_full_life_pays_for_all_that_is_used() -> None:
    assert full_life([Share(0.25, 400_000), Share(1.0, 90_000)]) == -300_000


def test_hard_asks_for_the_visit_and_short_units_for_their_price() -> None:
    assert hard(False, visit_usd=2_100_000) == -2_100_000
    assert hard(True, visit_usd=2_100_000) == 0
    assert pay_short(350, usd_per_unit=200) == -70_000
    assert pay_short(-350, usd_per_unit=200) == 0


def test_reserves_give_no_more_than_balance_or_bill() -> None:
    assert reserves_drawn(1_500_000, qualifying_usd=2_000_000) == 1_500_000
    assert reserves_drawn(2_500_000, qualifying_usd=2_000_000) == 2_000_000


def test_reserve_rate_rises_once_a_year() -> None:
    """Two and a half years at 1,000 USD a day, 4 % a year, worked by hand."""
    days = 2.5 * DAYS_PER_YEAR
    wanted = 50_000 + 365.25 * 1_000 * (1 + 1.04 + 0.5 * 1.0816)
    assert reserve_balance(50_000, usd_per_day=1_000, days=days, escalation_frac=0.04) == pytest.approx(wanted)


@given(used=st.floats(0, 1e5), interval=st.floats(1, 1e5))
def test_a_share_left_lies_between_nothing_and_all(used: float, interval: float) -> None:
    assert 0 <= left_frac(used, expected_interval=interval) <= 1


@given(shares=st.lists(st.builds(Share, FRAC, USD), max_size=5))
def test_half_life_is_full_life_plus_half_of_every_event(shares: list[Share]) -> None:
    halves = sum(share.event_usd for share in shares) / 2
    assert half_life(shares) == pytest.approx(full_life(shares) + halves, abs=1e-3)


@given(a=st.floats(0, 1e5), b=st.floats(0, 1e5), rate=st.floats(0, 1e3))
def test_a_two_way_mirror_is_fair(a: float, b: float, rate: float) -> None:
    there = mirror(a, left_at_delivery=b, usd_per_unit=rate, two_way=True)
    back = mirror(b, left_at_delivery=a, usd_per_unit=rate, two_way=True)
    assert there == pytest.approx(-back)
    assert mirror(a, left_at_delivery=b, usd_per_unit=rate, two_way=False) == min(0.0, there)


def test_impossible_figures_are_refused() -> None:
    with pytest.raises(OutOfRangeError, match="expected interval: found 0"):
        left_frac(100, expected_interval=0)
    with pytest.raises(OutOfRangeError, match="used since the event: found -5"):
        left_frac(-5, expected_interval=9_000)
    with pytest.raises(OutOfRangeError, match=r"share of life left: found 1\.2"):
        half_life([Share(1.2, 1_000)])
    with pytest.raises(OutOfRangeError, match="mirror rate, USD: found -3"):
        mirror(1, left_at_delivery=2, usd_per_unit=-3, two_way=True)
    with pytest.raises(OutOfRangeError, match="days of paying reserves: found -1"):
        reserve_balance(0, usd_per_day=1, days=-1)
