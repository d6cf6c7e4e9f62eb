"""The shop and the spares, run through ``simulate`` itself, against queueing theory.

Exponential removals and turn times, bays instead of slots, one-position aircraft, no limits, no wear. Figures: CHECKS'
machine interference (Rossetti, *Simulation Modeling and Arena*), Erlang's loss formula, and the Poisson pipeline (Palm
1938). Within three standard errors; the long forms reach 1 % precision.
"""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np
import pytest
from builders import exponential_removals, tiny_fleet

from sim.events import KIND, Log
from sim.fleet import Fleet, Shop
from sim.spec import setup
from sim.start import names
from sim.world import simulate

HOURS_A_YEAR = 8766.0
CYCLES_AN_HOUR = 2000.0  # a removal ends on a whole cycle: short ones keep the clock nearly continuous


def plain_fleet(*, tails: int, spares: int, per_hour: float, shops: tuple[Shop, ...], days: float) -> Fleet:
    """Return aircraft that fly round the clock, fail at a constant rate, and change engines in no time."""
    fleet = exponential_removals(tiny_fleet(tails=tails, spares=spares, parts=False), per_hour=per_hour)
    return replace(
        fleet,
        engine_types=(replace(fleet.engine_types[0], engine_change_days=0.0, reference_derate_frac=0.0),),
        aircraft=tuple(
            replace(a, hours_per_year=HOURS_A_YEAR, cycles_per_year=HOURS_A_YEAR * CYCLES_AN_HOUR)
            for a in fleet.aircraft
        ),
        shops=shops,
        shop_work=tuple(replace(w, shop=s.shop, days_median=days) for s in shops for w in fleet.shop_work),
    )


def shop(name: str, *, bays: int | None, transport: float = 0.0, law: str = "exponential") -> Shop:
    return Shop(shop=name, engine_type="T", bays=bays, transport_days=transport, turn_time_law=law)


def logs(fleet: Fleet, *, days: float, runs: int) -> list[Log]:
    ready = setup(fleet, "whole_engine", horizon_days=days)
    known = names(ready)
    return [simulate(ready, known, seed=2026, run=run) for run in range(runs)]


def mean_and_error(values: list[float]) -> tuple[float, float]:
    return float(np.mean(values)), float(np.std(values, ddof=1) / math.sqrt(len(values)))


def down_on_average(log: Log, days: float, warm_up: float) -> float:
    """Return the mean number of aircraft down after a warm-up."""
    lost = 0.0
    for row in log.rows:
        if row[0] == KIND["down"]:
            lost += max(0.0, row[2] - max(row[1], warm_up))
    return lost / (days - warm_up)


def _machine_repair(repairmen: int, wanted: float, *, days: float, runs: int) -> tuple[float, float]:
    fleet = plain_fleet(tails=5, spares=0, per_hour=0.10, shops=(shop("S", bays=repairmen),), days=4.0 / 24.0)
    mean, error = mean_and_error([down_on_average(log, days, 10.0) for log in logs(fleet, days=days, runs=runs)])
    assert abs(mean - wanted) < 3.0 * error, f"{mean:.4f} ± {error:.4f} against {wanted}"
    return mean, error


@pytest.mark.parametrize(("repairmen", "wanted"), [(1, 2.674), (2, 1.661), (3, 1.457)])
def test_machine_repair(repairmen: int, wanted: float) -> None:
    _machine_repair(repairmen, wanted, days=150.0, runs=6)


@pytest.mark.long
@pytest.mark.parametrize(("repairmen", "wanted"), [(1, 2.674), (2, 1.661), (3, 1.457)])
def test_machine_repair_at_one_per_cent(repairmen: int, wanted: float) -> None:
    mean, error = _machine_repair(repairmen, wanted, days=1500.0, runs=12)
    assert 1.96 * error < 0.01 * mean


def erlang_loss(servers: int, load: float) -> float:
    blocked = 1.0
    for n in range(1, servers + 1):
        blocked = load * blocked / (n + load * blocked)
    return blocked


def _loss(*, bays: int, load: float, days: float, runs: int) -> tuple[float, float]:
    """A first shop with so many bays; who finds them all busy goes to a second, a shade further away and unbounded."""
    stay = 1.0 / 24.0
    per_hour = load / 20.0  # twenty aircraft that never wait: arrivals are Poisson
    first, second = shop("first", bays=bays), shop("second", bays=None, transport=1e-7)
    fleet = plain_fleet(tails=20, spares=round(load * 3 + 60), per_hour=per_hour, shops=(first, second), days=stay)
    shares = []
    for log in logs(fleet, days=days, runs=runs):
        assert not any(row[0] == KIND["shortage"] for row in log.rows)
        sent = [row[7] for row in log.rows if row[0] == KIND["induction"] and row[1] > 1.0]
        shares.append(sent.count("second") / len(sent))
    return mean_and_error(shares)


def _check_loss(bays: int, load: float, *, days: float, runs: int) -> tuple[float, float]:
    mean, error = _loss(bays=bays, load=load, days=days, runs=runs)
    assert abs(mean - erlang_loss(bays, load)) < 3.0 * error + 1e-4, f"{mean:.4f} ± {error:.4f}"
    return mean, error


def test_erlang_loss() -> None:
    _check_loss(5, 4.0, days=12.0, runs=4)


@pytest.mark.long
@pytest.mark.parametrize(("bays", "load"), [(5, 4.0), (10, 10.0), (10, 40.0)])
def test_erlang_loss_at_one_per_cent(bays: int, load: float) -> None:
    # M/M/10/10, 40 an hour, service one hour: 0.7577 (Rossetti, parking example)
    assert erlang_loss(10, 40.0) == pytest.approx(0.7577, abs=5e-5)
    mean, error = _check_loss(bays, load, days=1600.0 / load, runs=6)
    assert 1.96 * error < 0.01 * mean


def test_engines_away_are_poisson() -> None:
    # pipeline of TRADE.md: 14.5 removals a year, 110 days away: mu 4.37; P(at most s away) for s = 3 ... 9
    wanted = (0.365, 0.557, 0.725, 0.847, 0.924, 0.965, 0.986)
    tails, away = 20, 110.0
    per_hour = 14.5 / (tails * HOURS_A_YEAR)
    fleet = plain_fleet(
        tails=tails, spares=25, per_hour=per_hour, shops=(shop("S", bays=None, law="fixed"),), days=away
    )
    days, warm_up = 7300.0, 400.0
    shares = []
    for log in logs(fleet, days=days, runs=24):
        gone = np.array([row[1] for row in log.rows if row[0] == KIND["removal"]])
        at = np.arange(warm_up, days, 7.0)
        count = np.searchsorted(gone, at) - np.searchsorted(gone, at - away)
        shares.append([(count <= s).mean() for s in range(3, 10)])
    mean = np.mean(shares, axis=0)
    error = np.std(shares, axis=0, ddof=1) / math.sqrt(len(shares))
    assert np.all(np.abs(mean - wanted) < 3.0 * error + 5e-4), (mean, error)
