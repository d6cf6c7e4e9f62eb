"""One run of one holding, as a worker makes it: what it costs, and how often and for how long own engines lack."""

from __future__ import annotations

from collections.abc import Mapping
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from planner.job import Scenario, prepare, summarise
from planner.shortage import covered_share, lacks, mean_number
from sim.removal import CAUSES
from sim.world import simulate

Floats = NDArray[np.float64]
_LEASE_END = CAUSES.index("lease_end")


class StockRow(NamedTuple):
    """The figures of one run of a holding; arrays by engine type.

    ``cover``: share of time in which own engines suffice; ``short``: positions without an own engine on average;
    ``waits``: share of time in which an aircraft stands; ``removals``: of own engines, a year.
    """

    total_usd: float
    cover: Floats
    short: Floats
    waits: Floats
    removals: Floats


def stock_job(payload: Mapping[str, tuple[Scenario, str]], holding: str, run: int) -> StockRow:
    """Simulate one run of a holding; ``payload`` has a scenario and a strategy by the holding's name."""
    scenario, strategy = payload[holding]
    ready = prepare(scenario, strategy)
    log = simulate(ready.setup, ready.known, seed=scenario.seed, run=run)
    row = summarise(ready, log)
    edges = np.array([0.0, scenario.horizon_days])
    found = lacks(scenario.fleet, log, end=scenario.horizon_days)
    kinds = [t.engine_type for t in scenario.fleet.engine_types]
    own = np.delete(row.removals, _LEASE_END, axis=1).sum(axis=1)
    return StockRow(
        total_usd=row.total_usd,
        cover=np.array([1.0 - covered_share(found.without_own[kind], edges)[0] for kind in kinds]),
        short=np.array([mean_number(found.without_own[kind], edges)[0] for kind in kinds]),
        waits=np.array([covered_share(found.waiting[kind], edges)[0] for kind in kinds]),
        removals=own * 365.25 / scenario.horizon_days,
    )
