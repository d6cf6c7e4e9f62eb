"""What will take an engine off: dates worked by hand, competing risks against draws, and no look at what is hidden."""

from __future__ import annotations

import datetime as dt
import math
from dataclasses import replace

import numpy as np
import pytest
from line_fleet import LIMITS, line_fleet

from planner.causes_ahead import Months, ahead, first_removal, gathered, month_edges, quantile_days
from planner.picture import picture
from sim.fleet import Fleet, Hazard, Lease, Utilisation

CYCLES_A_YEAR = 1900.0
AGE = 1500  # of the first engine of the line, with every module and part


def plain(**changes: object) -> Fleet:
    """A fleet whose engines only meet part limits: no wear, no chance causes, an even year."""
    fleet = line_fleet(aircraft=2, spares=0, hazards=False, wear=False)
    return replace(fleet, **changes)  # type: ignore[arg-type]


def first_engine(fleet: Fleet):  # type: ignore[no-untyped-def]
    view = picture(fleet)
    return view, view.tails["T001"].engines[0]


def test_a_limit_comes_on_the_day_that_the_years_use_reaches_it() -> None:
    """HPT: 15,000 - 1,500 = 13,500 cycles at 1,900 a year; then HPC, LPT, fan."""
    view, engine = first_engine(plain())
    one = ahead(view, engine, "T001")
    assert [(p.cause, engine.spec.modules[p.slot].module) for p in one.planned] == [
        ("limit", "HPT"),
        ("limit", "HPC"),
        ("limit", "LPT"),
        ("limit", "fan"),
    ]
    for planned, module in zip(one.planned, ("HPT", "HPC", "LPT", "fan"), strict=True):
        cycles = LIMITS[module] - AGE
        assert planned.cycles == cycles
        assert planned.day == pytest.approx(cycles / CYCLES_A_YEAR * 365.25, abs=1.0)
        assert planned.part_serial == f"P-{module}-001"


def test_half_the_use_from_a_date_on_doubles_what_is_left_then() -> None:
    change = Utilisation(tail="T001", from_day=730.5, hours_per_year=1550.0, cycles_per_year=950.0)
    view, engine = first_engine(plain(utilisation=(change,)))
    one = ahead(view, engine, "T001")
    flown = CYCLES_A_YEAR * 2.0
    days = 730.5 + (LIMITS["HPT"] - AGE - flown) / 950.0 * 365.25
    assert one.planned[0].day == pytest.approx(days, abs=1.5)


def test_a_tail_that_enters_later_ages_its_engines_from_then() -> None:
    fleet = plain()
    fleet = replace(fleet, aircraft=tuple(replace(a, entry_day=365.25) for a in fleet.aircraft))
    view, engine = first_engine(fleet)
    one = ahead(view, engine, "T001")
    assert one.planned[0].day == pytest.approx(365.25 + 13500 / CYCLES_A_YEAR * 365.25, abs=1.5)
    assert one.use.cycles(300.0) == 0.0


def test_a_return_an_exit_and_a_lease_in_end_on_their_dates() -> None:
    fleet = plain(leases=(Lease(lease="L", owner="A", return_day=500.0, terms="A", tail="T001", after_return="leave"),))
    fleet = replace(
        fleet,
        aircraft=tuple(replace(a, exit_day=900.0) for a in fleet.aircraft),
        engines=tuple(replace(e, lease_in_until_day=200.0) for e in fleet.engines),
    )
    view, engine = first_engine(fleet)
    ends = [(p.cause, p.day) for p in ahead(view, engine, "T001").planned[:3]]
    assert ends == [("lease_end", 200.0), ("return", 500.0), ("exit", 900.0)]
    assert ahead(view, engine, "T001", dated=False).planned[0].cause == "limit"


def test_an_extended_lease_takes_nothing_off() -> None:
    lease = Lease(lease="L", owner="A", return_day=500.0, terms="A", tail="T001", after_return="extend")
    view, engine = first_engine(plain(leases=(lease,)))
    assert "return" not in [p.cause for p in ahead(view, engine, "T001").planned]


def test_unknown_life_comes_off_today() -> None:
    fleet = plain()
    fleet = replace(fleet, parts=tuple(replace(p, life_known=p.part_serial != "P-LPT-001") for p in fleet.parts))
    view, engine = first_engine(fleet)
    first = ahead(view, engine, "T001").planned[0]
    assert (first.cause, first.day, first.part_serial) == ("unknown_life", 0.0, "P-LPT-001")


def test_an_exponential_cause_has_its_median_at_the_logarithm_of_two() -> None:
    scale = 5000.0
    hazard = Hazard(engine_type="N", module="fan", cause="unscheduled", run="mature", scale=scale, clock="hours")
    view, engine = first_engine(plain(hazards=(hazard,)))
    one = ahead(view, engine, "T001")
    p10, p50, p90 = quantile_days(one.chances, one.use)
    for day, chance in ((p10, 0.1), (p50, 0.5), (p90, 0.9)):
        assert day == pytest.approx(-math.log(1.0 - chance) * scale / 3100.0 * 365.25, rel=1e-3)


def test_quantiles_stop_at_the_planned_day() -> None:
    fleet = line_fleet(aircraft=2, spares=0)
    view = picture(fleet)
    one = ahead(view, view.tails["T001"].engines[0], "T001")
    days = quantile_days(one.chances, one.use, stop=one.planned_day)
    assert days[2] <= one.planned_day
    assert list(days) == sorted(days)


def test_the_law_of_the_first_removal_is_that_of_the_least_of_independent_draws() -> None:
    """200,000 draws of every cause by inversion; shares by cause and by half year agree within four standard errors."""
    view = picture(line_fleet(aircraft=3, spares=0))
    one = ahead(view, view.tails["T002"].engines[1], "T002")
    months = Months(month_edges(dt.date(2026, 7, 1), 120))
    law = first_removal(one, months)
    assert law.by_month.sum() + law.still_on[-1] == pytest.approx(1.0)
    rng = np.random.default_rng(5)
    draws = 200_000
    fine = np.linspace(0.0, 365.25 * 12, 4000)
    cycles = np.array([one.use.cycles(day) for day in fine])
    hours = np.array([one.use.hours(day) for day in fine])
    days = np.full((len(one.chances) + 1, draws), np.inf)
    for i, chance in enumerate(one.chances):
        days[i] = np.interp(rng.exponential(size=draws), gathered(chance, cycles, hours), fine, right=np.inf)
    days[-1] = one.planned_day
    first, which = days.min(axis=0), days.argmin(axis=0)
    names = [(c.cause, c.slot) for c in one.chances] + [(one.planned[0].cause, one.planned[0].slot)]
    found: dict[tuple[str, int], np.ndarray] = {}
    for column, name in enumerate(law.causes):
        found[name] = found.get(name, 0.0) + law.by_month[:, column]
    for name, by_month in found.items():
        mine = np.isin(which, [i for i, n in enumerate(names) if n == name])
        for half in range(0, 120, 6):
            low, high = months.edges[half], months.edges[half + 6]
            share = float((mine & (first >= low) & (first < high)).mean())
            expected = float(by_month[half : half + 6].sum())
            assert abs(share - expected) < 4.0 * math.sqrt(max(expected, 1e-5) / draws) + 2e-4, (name, half)


def test_nothing_that_is_drawn_in_secret_is_read() -> None:
    view = picture(line_fleet(aircraft=2, spares=0))
    engine = view.tails["T001"].engines[0]
    before = ahead(view, engine, "T001")
    for module in engine.modules:
        module.budgets = [1e-6 for _ in module.budgets]
        module.early_at = module.csb + 1
    assert ahead(view, engine, "T001") == before


def test_months_begin_on_the_as_of_date_and_end_with_the_calendar() -> None:
    edges = month_edges(dt.date(2026, 11, 20), 3)
    assert edges.tolist() == [0.0, 11.0, 42.0, 73.0]
