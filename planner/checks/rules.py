"""All rules in one tuple, and the records of a folder held to all of them."""

from __future__ import annotations

from pathlib import Path

from planner import tables
from planner.checks.catalogue import CATALOGUE_RULES
from planner.checks.cells import CELL_RULES
from planner.checks.contracts import CONTRACT_RULES
from planner.checks.counters import COUNTER_RULES
from planner.checks.facts import Facts
from planner.checks.fault import Rule, problems
from planner.checks.files import FILE_RULES
from planner.checks.headings import HEADING_RULES
from planner.checks.history import HISTORY_RULES
from planner.checks.keys import KEY_RULES
from planner.checks.lives import LIFE_RULES
from planner.checks.places import PLACE_RULES
from planner.collector import collector_at_rest
from planner.records import Records
from planner.settings import SETTING_RULES
from planner.tables import TABLE_RULES
from sim.errors import Problem

RECORD_RULES: tuple[Rule, ...] = (
    *KEY_RULES,
    *PLACE_RULES,
    *COUNTER_RULES,
    *HISTORY_RULES,
    *LIFE_RULES,
    *CATALOGUE_RULES,
    *CONTRACT_RULES,
)
RULES: tuple[Rule, ...] = (*FILE_RULES, *TABLE_RULES, *HEADING_RULES, *CELL_RULES, *SETTING_RULES, *RECORD_RULES)


def check(path: Path) -> tuple[Records, tuple[Problem, ...]]:
    """Return the records of a folder or workbook and every problem in them, in the order of files and rows.

    Raises RequestError where there is no fleet.
    """
    with collector_at_rest():
        records, found = tables.read(path)
        return records, in_order((*found, *record_problems(records)))


def record_problems(records: Records) -> tuple[Problem, ...]:
    """Return what breaks the rules on whole records."""
    facts = Facts(records)
    found: list[Problem] = []
    for rule in RECORD_RULES:
        found += [p._replace(file=records[p.table].file or p.file) for p in problems(rule, rule.check(facts))]
    return tuple(found)


def in_order(found: tuple[Problem, ...]) -> tuple[Problem, ...]:
    """Return problems by severity, file and row, so that what stops stands first."""
    return tuple(sorted(found, key=lambda p: (p.severity != "stops", p.file, p.row or 0, p.column, p.rule)))
