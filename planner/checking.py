"""The question ``check``: what is wrong in the records, and what moved since another version of them."""

from __future__ import annotations

from pathlib import Path
from typing import NamedTuple

from planner import tables
from planner.assemble import assumed
from planner.changes import Change, changes
from planner.checks.rules import check
from planner.records import inputs_fingerprint
from sim.errors import Problem


class Checked(NamedTuple):
    """``moved`` is None where no other version was named; ``stops`` says that the records cannot be used."""

    problems: tuple[Problem, ...]
    moved: tuple[Change, ...] | None
    assumptions: tuple[str, ...]
    inputs: str
    demo: bool

    @property
    def stops(self) -> bool:
        return any(problem.severity == "stops" for problem in self.problems)

    def count(self, severity: str) -> int:
        return sum(problem.severity == severity for problem in self.problems)


def answer(fleet: Path, against: Path | None = None) -> Checked:
    """Return the problems of a fleet's records. Raises RequestError where either path holds no fleet."""
    records, found = check(fleet)
    moved = None
    if against is not None:
        other, _ = tables.read(against)
        moved = changes(other, records)
    notes = tuple(f"{name}: {text}" for name, text in assumed(records).items())
    return Checked(found, moved, notes, inputs_fingerprint(records), bool(records.settings.get("demo")))
