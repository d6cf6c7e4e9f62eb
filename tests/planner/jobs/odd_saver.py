"""Saves studies as a process of its own: `python odd_saver.py HOME FIRST_SEED`; prints each name once it is saved."""

from __future__ import annotations

import sys
from itertools import count
from pathlib import Path

import odd_jobs
import pyarrow as pa

from planner import store
from planner.manifest import Manifest


def manifest(seed: int, **more: object) -> Manifest:
    """Return the manifest of a made-up study."""
    plain = {
        "command": "compare",
        "version": "0.1.0",
        "sources": "s" * 64,
        "probe": "p" * 64,
        "inputs": "i" * 64,
        "seed": seed,
        "strategies": ("whole_engine", "exchange"),
        "settings": {"precision_frac": 0.01, "horizon_years": 10},
        "runs": 3,
        "made_at": f"2026-07-01T00:00:{seed % 60:02d}+00:00",
    }
    return Manifest(**{**plain, **more})


def rows(seed: int) -> dict:
    """Return the rows of that study."""
    tasks = [(strategy, run) for run in range(3) for strategy in ("whole_engine", "exchange")]
    return {task: odd_jobs.steady({"name": f"saved {seed}"}, *task) for task in tasks}


def save(home: Path, seed: int) -> str:
    """Save that study."""
    inputs = {"parts.csv": f"part_serial\nÄ{seed}\n".encode(), "settings.csv": b"name,value\n"}
    costs = pa.table({"line": ["parts", "fuel"], "usd_mean": [1.5 * seed, 2.0]})
    return store.save(home, manifest(seed), inputs=inputs, rows=rows(seed), tables={"costs": costs})


if __name__ == "__main__":
    for number in count(int(sys.argv[2])):
        print(save(Path(sys.argv[1]), number), flush=True)
