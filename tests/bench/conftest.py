"""Worker processes must be able to import the jobs that benchmarks give them: those stand in tests/planner/jobs."""

from __future__ import annotations

import sys
from pathlib import Path

sys.path.append(str(Path(__file__).parents[1] / "planner" / "jobs"))
