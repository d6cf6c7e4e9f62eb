"""How long records take to be read and checked, and how that grows."""

from __future__ import annotations

import resource
import time
from pathlib import Path

import pytest
import small_tables

from planner.assemble import assemble
from planner.checks.rules import check
from planner.life import lives

pytestmark = pytest.mark.bench


def many(count: int) -> small_tables.Tables:
    """Return a sound fleet with about ``count`` parts: engines on tails of two, a module and part of each kind."""
    tables = small_tables.small_tables()
    copies = max(1, count // len(tables["parts"]))
    renamed = ("aircraft", "engines", "modules", "parts", "part_history")
    names = {"tail", "engine_serial", "module_serial", "part_serial"}
    for table in renamed:
        first = tables[table]
        tables[table] = [
            {key: f"{value}-{copy}" if key in names and value and copy else value for key, value in row.items()}
            for copy in range(copies)
            for row in first
        ]
    return tables


def test_reading_and_checking_grow_in_line(tmp_path: Path) -> None:
    print("\n   parts  rows of history   check s  assemble s   life s   s per 10,000 parts   most memory MB")
    for count in (1_000, 10_000, 100_000):
        folder = small_tables.write(tmp_path / str(count), many(count))
        began = time.process_time()
        records, found = check(folder)
        checked = time.process_time()
        assert [p for p in found if p.severity == "stops"] == []
        fleet = assemble(records)
        made = time.process_time()
        assert len(lives(fleet).parts) == len(fleet.parts)
        ended = time.process_time()
        memory = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1000
        seconds = checked - began
        print(
            f"{len(fleet.parts):8,}  {len(records['part_history']):15,}  {seconds:8.2f}  {made - checked:10.2f}"
            f"  {ended - made:7.2f}  {seconds / len(fleet.parts) * 1e4:19.3f}  {memory:15.0f}"
        )
