"""Queues in closed form against what defines them: balance, limits, and a chain solved by brute force."""

from __future__ import annotations

import math

import numpy as np
import pytest

from sim.errors import RequestError
from sim.queues import erlang_loss, machine_repair, offered_at_loss, slot_wait_days, waiting


def chain_law(births: list[float], deaths: list[float]) -> np.ndarray:
    """Return the long-run law of a birth and death chain from its generator matrix, not from its product form."""
    n = len(births) + 1
    rates = np.zeros((n, n))
    for x in range(n - 1):
        rates[x, x + 1] = births[x]
        rates[x + 1, x] = deaths[x]
    rates -= np.diag(rates.sum(axis=1))
    system = np.vstack([rates.T, np.ones(n)])
    return np.linalg.lstsq(system, np.array([0.0] * n + [1.0]), rcond=None)[0]


@pytest.mark.parametrize(("servers", "offered"), [(1, 0.3), (4, 2.5), (9, 12.0)])
def test_loss_is_the_last_state_of_its_chain(servers: int, offered: float) -> None:
    law = chain_law([offered] * servers, [float(x + 1) for x in range(servers)])
    assert erlang_loss(servers, offered) == pytest.approx(law[-1], rel=1e-9)


def test_a_load_found_for_a_loss_loses_that_share() -> None:
    assert erlang_loss(7, offered_at_loss(7, 0.013)) == pytest.approx(0.013, rel=1e-9)


def test_nothing_offered_is_never_lost_unless_there_is_no_server() -> None:
    assert erlang_loss(3, 0.0) == 0.0
    assert erlang_loss(0, 0.0) == 1.0


@pytest.mark.parametrize("repairmen", [1, 2, 7])
@pytest.mark.parametrize("spares", [0, 2])
def test_machine_repair_is_its_chain(repairmen: int, spares: int) -> None:
    machines, failure, repair = 5, 0.3, 0.8
    all_of_them = machines + spares
    births = [min(machines, all_of_them - x) * failure for x in range(all_of_them)]
    deaths = [min(x + 1, repairmen) * repair for x in range(all_of_them)]
    law = chain_law(births, deaths)
    found = machine_repair(machines=machines, failure=failure, repair=repair, repairmen=repairmen, spares=spares)
    assert found.down_chance == pytest.approx(law, abs=1e-12)
    short = sum(p * max(0, x - spares) for x, p in enumerate(law))
    assert found.short_mean == pytest.approx(short)
    # what fails is what is repaired
    at_work = sum(p * min(x, repairmen) for x, p in enumerate(law))
    assert found.rate == pytest.approx(at_work * repair)


def test_many_machines_that_seldom_fail_are_poisson() -> None:
    """The finite fleet meets Palm's theorem when the fleet is large against what is away."""
    found = machine_repair(machines=4000, failure=3.0 / 4000.0, repair=1.0, spares=5)
    poisson = [math.exp(-3.0) * 3.0**x / math.factorial(x) for x in range(9)]
    assert found.down_chance[:9] == pytest.approx(poisson, rel=0.02)


def test_a_waiting_line_obeys_little_and_one_server_is_the_textbook_one() -> None:
    found = waiting(arrivals=2.0, service=3.0, servers=1)
    assert found.inside_mean == pytest.approx(2.0)  # rho / (1 - rho)
    assert found.inside_mean == pytest.approx(2.0 * found.stay_mean)


def test_a_full_waiting_line_is_refused() -> None:
    with pytest.raises(RequestError, match="less than 1"):
        waiting(arrivals=10.0, service=5.0, servers=2)


def test_a_slot_every_thirty_days_makes_a_lone_job_wait_fifteen() -> None:
    assert slot_wait_days(per_day=1e-9, interval_days=30.0) == pytest.approx(15.0)
    assert slot_wait_days(per_day=0.9 / 30.0, interval_days=30.0) == pytest.approx(150.0)
    assert slot_wait_days(per_day=0.04, interval_days=30.0) == math.inf


def test_the_wait_for_slots_is_what_a_long_line_of_arrivals_meets() -> None:
    """Poisson arrivals to slots of sim/shop.py: the mean of 40,000 waits lies within three standard errors."""
    from sim.shop import Slots

    rng = np.random.default_rng(20260701)
    slots = Slots(1.0)
    interval = 365.25 / 12.0
    arrivals = np.cumsum(rng.exponential(interval / 0.6, size=40_000))
    waits = np.array([slots.start(float(day), 0.0) - float(day) for day in arrivals])
    batches = waits.reshape(100, 400).mean(axis=1)
    error = batches.std(ddof=1) / math.sqrt(batches.size)
    expected = slot_wait_days(per_day=0.6 / interval, interval_days=interval)
    assert abs(waits.mean() - expected) < 3.0 * error
    assert error < 0.02 * expected


def test_impossible_requests_are_refused() -> None:
    with pytest.raises(RequestError, match="numbers from 0"):
        erlang_loss(-1, 1.0)
    with pytest.raises(RequestError, match="a machine"):
        machine_repair(machines=0, failure=0.1, repair=0.1)
