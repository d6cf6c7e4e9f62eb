"""Money after events: a story worked to the cent, lines that add up, discounting against a textbook figure."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from builders import tiny_fleet

from planner.job import Scenario, run_job, run_log
from planner.ledger import Ledger
from sim.errors import UnpricedError
from sim.events import KIND, Log
from sim.fleet import Fleet, Index, WearRow
from sim.pricing import LINES, VALUE_LINES
from sim.spec import Setup, setup


def priced(fleet: Fleet, days: float, strategy: str = "whole_engine") -> dict[str, float]:
    row = run_job(Scenario(fleet=fleet, horizon_days=days, seed=1), strategy, 0)
    by_line = row.costs.sum(axis=(0, 1))
    assert row.total_usd == pytest.approx(by_line.sum(), abs=1e-6)
    cash = sum(v for line, v in zip(LINES, by_line, strict=True) if line not in VALUE_LINES)
    assert row.cash_usd == pytest.approx(cash, abs=1e-6)
    return {line: float(v) for line, v in zip(LINES, by_line, strict=True) if v}


def test_the_story_of_two_aircraft_to_the_cent() -> None:
    # see tests/sim/test_simulate.py: two core visits, two changes, 34 aircraft-days, 270 days of a spare on the shelf
    found = priced(tiny_fleet(), 300.0)
    cash = {line: usd for line, usd in found.items() if line not in VALUE_LINES}
    assert cash == pytest.approx(
        {
            "work": 2 * (5_000 + 5_000),
            "parts": 2 * 40_000,
            "access": 2 * (1_000 + 1_000),
            "engine_level": 2 * 20_000,
            "test": 2 * 2_000,
            "transport": 2 * 2 * 1_500,
            "engine_change": 2 * 10_000,
            "downtime": 34 * 1_000,
            "spare_keeping": 270 * 200,
        },
        abs=0.005,
    )
    # life: fan disks used 1,000 + 72, 1,000, 192 of 10,000; core disks 72, 0 and 192 of 1,000; a restoration of 50,000
    # lasts 100,000 cycles on each of six modules
    parts = 40_000 * ((1_072 + 1_000 + 192) / 10_000 + (72 + 0 + 192) / 1_000)
    modules = 50_000 * 2 * (1_072 + 1_000 + 192) / 100_000
    assert found["life_start"] + found["life_end"] == pytest.approx(parts + modules, abs=0.005)
    assert found["stock_start"] + found["stock_end"] == pytest.approx(0.0, abs=0.005)


def test_dear_parts_double_the_parts_line_and_move_no_removal() -> None:
    fleet = tiny_fleet()
    dear = replace(fleet, part_types=tuple(replace(p, price_usd=2 * p.price_usd) for p in fleet.part_types))
    one, two = priced(fleet, 900.0), priced(dear, 900.0)
    assert two["parts"] == pytest.approx(2 * one["parts"])
    logs = [run_log(Scenario(fleet=f, horizon_days=900.0, seed=1), "whole_engine", 0) for f in (fleet, dear)]
    removals = [[r for r in log.rows if r[0] == KIND["removal"]] for log in logs]
    assert removals[0] == removals[1]


def test_fuel_price_moves_only_fuel() -> None:
    fleet = tiny_fleet()
    wear = tuple(
        WearRow(engine_type="T", rating="one", module=m, loss_degC_per_1000_cycles=10.0, fuel_frac_per_degC=0.001)
        for m in ("fan", "core")
    )
    fleet = replace(fleet, wear=wear)
    dear = replace(fleet, settings=replace(fleet.settings, fuel_price_usd_per_kg=1.70))
    one, two = priced(fleet, 900.0), priced(dear, 900.0)
    assert two.pop("wear_fuel") == pytest.approx(2 * one.pop("wear_fuel"))
    assert one == two


def test_wear_fuel_is_the_integral_of_the_loss() -> None:
    # two modules losing 10 degC per 1,000 cycles for 400 cycles (100 days, no removal): mean loss 2 degC each
    wear = tuple(
        WearRow(engine_type="T", rating="one", module=m, loss_degC_per_1000_cycles=10.0, fuel_frac_per_degC=0.001)
        for m in ("fan", "core")
    )
    row = run_job(Scenario(fleet=tiny_fleet(tails=1, wear=wear), horizon_days=100.0, seed=1), "whole_engine", 0)
    # no derate against 8 % in the table, 2 % of wear a point: 1.16 times the table's loss
    assert row.fuel_kg == pytest.approx(1.16 * 400 * 1000.0 * 0.001 * (2.0 + 2.0))
    assert row.co2_kg == pytest.approx(row.fuel_kg * 3.16)  # ICAO CORSIA, Annex 16 Vol IV


def _ready(rate: float, **changes: object) -> tuple[Setup, Ledger]:
    fleet = tiny_fleet()
    fleet = replace(fleet, settings=replace(fleet.settings, discount_rate_frac=rate), **changes)  # type: ignore[arg-type]
    ready = setup(fleet, "whole_engine", horizon_days=5 * 365.25)
    return ready, Ledger(ready)


def test_discounting_gives_the_textbook_present_value() -> None:
    # -40,000, 5,000, 8,000, 12,000, 30,000 at 8 %: 3,065.22 (documentation of numpy-financial; first flow now)
    ready, ledger = _ready(0.08)
    item = ready.catalogue.number("fuel", "T")
    price = ready.catalogue.price(item)
    log = Log()
    for year, usd in enumerate((-40_000, 5_000, 8_000, 12_000, 30_000)):
        log.cost(year * 365.25, item, usd / price, "x")
    assert ledger.price(log).cash == pytest.approx(3_065.22, abs=0.005)


def test_a_span_is_discounted_over_its_days() -> None:
    ready, ledger = _ready(0.08)
    item = ready.catalogue.number("downtime", "T")
    log = Log()
    log.span(KIND["down"], 100.0, 900.0, item, 800.0, "A1")
    slow = sum(1_000.0 * 1.08 ** (-(100.5 + day) / 365.25) for day in range(800))
    assert ledger.price(log).cash == pytest.approx(slow, rel=1e-6)


def test_prices_step_up_on_the_first_of_january() -> None:
    ready, ledger = _ready(0.0, indices=(Index(index="parts", per_year_frac=0.06),))
    item = ready.catalogue.number("part", "core-disk")
    for day, factor in ((0.0, 1.0), (183.0, 1.0), (184.0, 1.06), (184.0 + 365, 1.06**2)):
        log = Log()
        log.cost(day, item, 1.0, "x")
        assert ledger.price(log).cash == pytest.approx(40_000 * factor), day


def test_an_unpriced_event_is_an_error() -> None:
    ready, ledger = _ready(0.0)
    log = Log()
    log.cost(1.0, ready.catalogue.number("work", "T", "fan", "polish", "S"), 1.0, "x")
    with pytest.raises(UnpricedError, match="work T fan polish S"):
        ledger.price(log)


def test_years_and_types_add_up_to_the_lines() -> None:
    row = run_job(Scenario(fleet=tiny_fleet(), horizon_days=900.0, seed=1), "exchange", 0)
    assert row.costs.shape == (3, 1, len(LINES))
    assert math.isclose(float(np.sum(row.costs)), row.total_usd, rel_tol=1e-12)
