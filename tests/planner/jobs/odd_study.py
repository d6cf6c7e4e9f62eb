"""A study as a process of its own: `python odd_study.py HOME RUNS SECONDS WORKERS`, one line for each run shown."""

from __future__ import annotations

import sys
from pathlib import Path

import odd_jobs

from planner.execute import execute, where_from
from planner.kept import Kept


def main() -> None:
    home, runs, seconds, workers = Path(sys.argv[1]), int(sys.argv[2]), float(sys.argv[3]), int(sys.argv[4])
    tasks = [("exchange", run) for run in range(runs)]
    payload = {"name": "process", "seconds": seconds}
    with Kept(home, {"exchange": "key"}, odd_jobs.OddRow) as kept:
        print(f"found {kept.count()}", flush=True)
        for task, row in execute(odd_jobs.steady, payload, tasks, where=where_from(workers, None), kept=kept):
            print(f"run {task[1]} {row.total_usd!r}", flush=True)
    print("done", flush=True)


if __name__ == "__main__":
    main()
