"""A job that costs a known piece of work and leaves a row of the size that a run of the demo fleet leaves."""

from __future__ import annotations

from typing import Any

import numpy as np
import odd_jobs


def busy(payload: dict[str, Any], strategy: str, run: int) -> odd_jobs.OddRow:
    """Count in plain Python for ``payload["loops"]`` rounds, as event code does, and return some 8 kB."""
    total = float(run)
    for number in range(payload["loops"]):
        total += number % 7 * 0.5
    return odd_jobs.OddRow(total, np.full(1000, total), run)
