"""A runner that answers one made-up question, as a process of its own: `python odd_runner.py HOME`."""

from __future__ import annotations

import os
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import odd_jobs

from planner.execute import Where, execute
from planner.kept import Kept
from planner.runner_process import serve
from sim.errors import RequestError


def odd_answer(
    request: dict[str, Any],
    *,
    progress: Callable[[int, int, float], None],
    cancelled: Callable[[], bool],
    notice: Callable[[str], None],
    note: Callable[[dict[str, Any]], None],
) -> dict[str, Any]:
    """Run the asked number of runs and answer with their figures; some questions are at fault on purpose."""
    if request.get("fault") == "user":
        raise RequestError("--runs", "0", "1 or more")
    if request.get("fault") == "program":
        raise ZeroDivisionError("a made-up fault")
    if request.get("fault") == "dies":
        os._exit(3)
    tasks = [("exchange", run) for run in range(request["runs"])]
    figures = []
    with Kept(Path(sys.argv[1]), {"exchange": request["name"]}, odd_jobs.OddRow) as kept:
        found = kept.count()
        for _, row in execute(
            odd_jobs.steady,
            {"name": request["name"], "seconds": request.get("seconds", 0.0)},
            tasks,
            where=Where(workers=2),
            kept=kept,
            progress=progress,
            cancelled=cancelled,
            notice=notice,
        ):
            figures.append(row.total_usd)
            if len(figures) % 10 == 0:
                note({"runs": len(figures)})
    return {"study": "0123456789abcdef", "figures": figures, "found": found}


if __name__ == "__main__":
    serve(Path(sys.argv[1]), answers={"odd": odd_answer}, idle_seconds=float(os.environ.get("ODD_IDLE", "20")))
