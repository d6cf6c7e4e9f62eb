"""What is paid at a lease's return, by each rule of money. Amounts are USD to the operator: what it pays is negative.

========================  =====================================================================
hard                      a failed condition asks for the visit that cures it
pay a unit short          ``-max(0, short) · rate``
mirror, two-way           ``(left at return - left at delivery) · rate``: better than delivered is paid for
mirror, one-way           the same, but only ever paid by the operator
full life                 ``(left fraction - 1) · cost of the event``
half life                 ``(left fraction - 1/2) · cost of the event``
reserves                  the balance, up to the cost of a qualifying visit, is drawn
========================  =====================================================================

Source: common practice of engine leases, as TRADE.md states it with its worked cases. "Left" is counted in the rule's
own unit, cycles or hours, and a fraction left lies between 0 and 1: flying beyond the interval is not paid twice.
"""

from __future__ import annotations

from collections.abc import Iterable
from typing import NamedTuple

from sim.errors import OutOfRangeError

DAYS_PER_YEAR = 365.25


class Share(NamedTuple):
    """One event's share of life left and what the whole event costs, for the full-life and half-life rules."""

    left_frac: float
    event_usd: float


def left_frac(used: float, *, expected_interval: float) -> float:
    """Return the share of an interval that is left after ``used`` of it, both in hours or both in cycles."""
    if expected_interval <= 0:
        raise OutOfRangeError("expected interval", f"{expected_interval:g}", "more than 0")
    if used < 0:
        raise OutOfRangeError("used since the event", f"{used:g}", "0 or more")
    return max(0.0, 1.0 - used / expected_interval)


def hard(fulfilled: bool, *, visit_usd: float) -> float:
    """Return minus the visit that a failed condition asks for, 0 when it is fulfilled."""
    return 0.0 if fulfilled else -_cost("visit", visit_usd)


def pay_short(short_units: float, *, usd_per_unit: float) -> float:
    """Return what units short of a condition cost; units to spare earn nothing."""
    return -max(0.0, short_units) * _cost("price of a unit short", usd_per_unit) or 0.0


def mirror(left_at_return: float, *, left_at_delivery: float, usd_per_unit: float, two_way: bool) -> float:
    """Return the money for the difference to delivery; a one-way mirror never pays the operator."""
    amount = (left_at_return - left_at_delivery) * _cost("mirror rate", usd_per_unit)
    return amount if two_way else min(0.0, amount)


def full_life(shares: Iterable[Share]) -> float:
    """Return minus the price of all life that is not there, over the events of the rule."""
    return sum((_fraction(share) - 1.0) * _cost("event", share.event_usd) for share in shares)


def half_life(shares: Iterable[Share]) -> float:
    """Return the money for life above (positive) or below half, summed over the events of the rule."""
    return sum((_fraction(share) - 0.5) * _cost("event", share.event_usd) for share in shares)


def reserves_drawn(balance_usd: float, *, qualifying_usd: float) -> float:
    """Return what a reserve account gives towards a qualifying visit: never more than either."""
    return min(max(0.0, balance_usd), _cost("qualifying visit", qualifying_usd))


def reserve_balance(balance_usd: float, *, usd_per_day: float, days: float, escalation_frac: float = 0.0) -> float:
    """Return the balance after ``days`` of paying in, the rate rising once in each full year from the as-of date."""
    if days < 0:
        raise OutOfRangeError("days of paying reserves", f"{days:g}", "0 or more")
    rate, left = _cost("reserve rate", usd_per_day), days
    while left > 0:
        balance_usd += rate * min(left, DAYS_PER_YEAR)
        rate *= 1.0 + escalation_frac
        left -= DAYS_PER_YEAR
    return balance_usd


def _cost(what: str, usd: float) -> float:
    if usd < 0:
        raise OutOfRangeError(f"{what}, USD", f"{usd:g}", "0 or more")
    return usd


def _fraction(share: Share) -> float:
    if not 0.0 <= share.left_frac <= 1.0:
        raise OutOfRangeError("share of life left", f"{share.left_frac:g}", "0 to 1")
    return share.left_frac
