"""How fast a run is, as ratios inside one process: against the bare kernel, a day-by-day numpy loop, and itself at
other sizes. Nothing here passes or fails by time; the table is printed (``pytest -m bench -s tests/bench``)."""

from __future__ import annotations

import datetime as dt
import time
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from statistics import median
from typing import Any

import numpy as np
import pytest
from simpy import Environment

from planner.assemble import load
from planner.demo.make import make
from planner.job import Scenario, prepare, run_job
from sim.events import KIND
from sim.fleet import Fleet
from sim.setting_out import set_out
from sim.world import World, simulate

pytestmark = pytest.mark.bench
YEARS = 10.0
DAYS = YEARS * 365.25


def cpu(work: Callable[[], Any], *, times: int = 7) -> float:
    """Return the median CPU seconds of a call."""
    found = []
    for _ in range(times):
        began = time.process_time()
        work()
        found.append(time.process_time() - began)
    return median(found)


def fleet_of(aircraft: int, folder: Path) -> Fleet:
    make(folder / f"fleet{aircraft}", aircraft=aircraft, seed=7, plain=True)
    return load(folder / f"fleet{aircraft}")


def scenario(fleet: Fleet) -> Scenario:
    return Scenario(fleet=fleet, horizon_days=DAYS, seed=1)


def kernel_events(ready: Any) -> int:
    """Return how many events the kernel has stepped through in one run."""
    world = World(ready.setup, ready.known, seed=1, run=0)
    set_out(world)
    for aircraft in world.aircraft:
        world.env.process(aircraft.life())
    count = 0
    while world.env.peek() < DAYS:
        world.env.step()
        count += 1
    return count


def bare_kernel(events: int) -> None:
    """So many timeouts among 1,000 pending, and nothing else."""
    env = Environment()

    def tick() -> Any:
        while True:
            yield env.timeout(1.0)

    for _ in range(1000):
        env.process(tick())
    for _ in range(events):
        env.step()


def day_by_day(fleet: Fleet, seed: int = 1) -> int:
    """The same fleet as a planner would loop over it: each day, arrays over engines; limits, margin along the expected
    law, chance causes as daily chances, a spare if there is one, a fixed time away. Returns the removals."""
    rng = np.random.default_rng(seed)
    engines = [e for e in fleet.engines if e.place == "wing"]
    tails = {a.tail: a for a in fleet.aircraft}
    count = len(engines)
    per_day = np.array([tails[e.tail].cycles_per_year / 365.25 for e in engines])
    chance = np.array([tails[e.tail].hours_per_year / 365.25 * 0.00002 for e in engines])
    left = rng.uniform(500, 6000, count)
    margin = rng.uniform(10, 60, count)
    loss = np.full(count, 0.004)
    back = np.zeros(count)
    cash = np.zeros(int(DAYS))
    removals, spares = 0, 5
    returning: list[float] = []
    for day in range(int(DAYS)):
        date = dt.timedelta(days=day)
        flying = back <= day
        left -= per_day * flying
        margin -= loss * per_day * flying
        strike = rng.random(count) < chance
        off = flying & ((left <= 0) | (margin <= 5) | strike)
        while returning and returning[0] <= day:
            returning.pop(0)
            spares += 1
        for engine in np.flatnonzero(off):
            removals += 1
            returning.append(day + 115.0)
            if spares:
                spares -= 1
                back[engine] = day + 1.5
            else:
                back[engine] = returning.pop(0) + 1.5
            left[engine], margin[engine] = 6000.0, 60.0
            cash[day] += 3.0e6
        cash[day] += (~flying).sum() * 42_000 * 1.085 ** -(date.days / 365.25)
    return removals


def test_a_run_against_the_kernel_and_the_loop(tmp_path: Path) -> None:
    fleet = fleet_of(40, tmp_path)
    found = scenario(fleet)
    print(f"\n{'40 aircraft, 10 years':34s} {'ms':>8s} {'x kernel':>9s} {'ev/removal':>11s} {'loop/run':>9s}")
    loop = cpu(lambda: day_by_day(fleet), times=3)
    for name in ("whole_engine", "exchange", "cheapest"):
        ready = prepare(found, name)
        run_job(found, name, 0)
        events = kernel_events(ready)
        log = simulate(ready.setup, ready.known, seed=1, run=0)
        removals = sum(row[0] == KIND["removal"] for row in log.rows)
        whole = cpu(lambda name=name: run_job(found, name, 1))
        kernel = cpu(lambda events=events: bare_kernel(events))
        print(f"{name:34s} {whole * 1e3:8.1f} {whole / kernel:9.1f} {events / removals:11.2f} {loop / whole:9.2f}")
        assert removals > 100


def test_growth_from_50_to_1000_engines(tmp_path: Path) -> None:
    print(f"\n{'engines':>8s} {'ms a run':>9s} {'us an engine-year':>18s}")
    for aircraft in (25, 100, 500):
        fleet = fleet_of(aircraft, tmp_path)
        found = scenario(fleet)
        run_job(found, "exchange", 0)
        seconds = cpu(lambda found=found: run_job(found, "exchange", 1), times=3)
        engines = len(fleet.engines)
        print(f"{engines:8d} {seconds * 1e3:9.1f} {seconds * 1e6 / engines / YEARS:18.1f}")
        assert engines >= 2 * aircraft


def test_a_hundred_runs_keep_memory_flat(tmp_path: Path) -> None:
    import resource

    found = replace(scenario(fleet_of(40, tmp_path)))
    run_job(found, "exchange", 0)
    peaks = []
    for run in range(60):
        run_job(found, "exchange", run)
        peaks.append(resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024)
    print(f"\npeak memory after 20 runs {peaks[19]:.0f} MB, after 60 runs {peaks[-1]:.0f} MB")
    assert peaks[-1] < peaks[19] * 1.25
