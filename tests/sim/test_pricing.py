"""Prices as values: one catalogue for strategies and ledger."""

from __future__ import annotations

import math

from builders import tiny_fleet

from sim.pricing import LINES, catalogue


def test_a_shops_factor_is_in_the_price_of_its_work() -> None:
    from dataclasses import replace

    fleet = tiny_fleet()
    dear = replace(fleet, shops=(replace(fleet.shops[0], price_factor=1.5),))
    for fleet_, price in ((fleet, 50_000.0), (dear, 75_000.0)):
        prices = catalogue(fleet_)
        assert prices.price(prices.number("work", "T", "core", "restoration", "S")) == price


def test_keeping_a_spare_costs_its_rate_a_day() -> None:
    prices = catalogue(tiny_fleet())
    assert prices.price(prices.number("keeping", "T", "engine")) == 3_652_500.0 * 0.02 / 365.25


def test_an_unknown_piece_of_work_has_no_price() -> None:
    prices = catalogue(tiny_fleet())
    assert math.isnan(prices.price(prices.number("work", "T", "core", "polish", "S")))


def test_every_item_belongs_to_a_line() -> None:
    assert {item.line for item in catalogue(tiny_fleet()).items} <= set(LINES)
