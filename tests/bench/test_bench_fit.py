"""How long fits take: one Weibull, one engine's trend, the demo fleet, and growth up to 1,000 engines.

Printed, never a pass mark (run with ``-m bench -s``).
"""

from __future__ import annotations

import statistics
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from planner.demo.make import fleet_tables
from planner.demo.write import write_tables
from planner.fit import of_records
from planner.fit_hazard import Lives, lives, weibull
from planner.fit_margin import Stretch, columns
from planner.fit_margin_pool import Belief, pool
from planner.tables import read

pytestmark = pytest.mark.bench


def cpu_seconds(work: Callable[[], object], *, times: int = 7) -> float:
    """Return the median CPU time of a piece of work after one run to warm up."""
    work()
    spent = []
    for _ in range(times):
        start = time.process_time()
        work()
        spent.append(time.process_time() - start)
    return statistics.median(spent)


def past(count: int, *, looks: bool) -> Lives:
    rng = np.random.default_rng(1)
    fails, leaves = 9_000.0 * rng.weibull(3.0, count), rng.uniform(3_000.0, 12_000.0, count)
    ends = np.minimum(fails, leaves)
    good = np.floor(ends / 500.0) * 500.0 if looks else np.full(count, np.nan)
    return lives(ends, fails <= leaves, last_good=good)


def stretches(count: int) -> list[Stretch]:
    rng = np.random.default_rng(2)
    cycles = np.arange(100.0, 4_600.0, 150.0)
    washes = tuple(np.arange(0.0, 5_000.0, 500.0))
    found = []
    for number in range(count):
        plain = Stretch(f"E{number}", cycles, cycles, np.zeros_like(cycles), washes=washes)
        theta = np.array([60.0, rng.normal(4.0, 0.5), rng.normal(12.0, 1.5), rng.normal(5.0, 0.5)])
        margin = columns(plain, cycles, ()) @ theta + rng.normal(0.0, 2.5, len(cycles))
        found.append(plain._replace(margin_degC=margin))
    return found


def test_speed_of_fits(tmp_path: Path) -> None:
    print()
    small = cpu_seconds(lambda: weibull(past(100, looks=False)))
    for count, looks in ((100, False), (100, True), (1_000, False), (10_000, False)):
        data = past(count, looks=looks)
        spent = cpu_seconds(lambda data=data: weibull(data))  # type: ignore[misc]
        how = "between looks" if looks else "exact"
        print(
            f"Weibull, {count:6d} lives, {how:13s} {1000 * spent:8.1f} ms  {spent / small:5.1f} times 100 exact lives"
        )
    belief = Belief(4.0, 12.0, 5.0)
    one = 0.0
    for count in (10, 100, 1_000):
        group = stretches(count)
        spent = cpu_seconds(lambda group=group: pool(group, belief, noise_degC=2.5), times=1 if count == 1_000 else 3)  # type: ignore[misc]
        one = one or spent / count
        print(
            f"margin trends, {count:4d} engines of 30 readings {1000 * spent:9.1f} ms  "
            f"{spent / count / one:4.2f} times the cost an engine of ten"
        )
    for aircraft in (10, 40):
        folder = tmp_path / str(aircraft)
        folder.mkdir()
        write_tables(folder, fleet_tables(aircraft=aircraft, seed=7, plain=True))
        records = read(folder)[0]
        spent = cpu_seconds(lambda records=records: of_records(records), times=3)  # type: ignore[misc]
        print(f"whole question, {aircraft:3d} aircraft                {1000 * spent:9.1f} ms")
