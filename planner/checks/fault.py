"""What a rule returns, and what a rule is."""

from __future__ import annotations

import difflib
from collections.abc import Callable, Iterable
from typing import Any, NamedTuple

from sim.errors import Problem

MOST_FAULTS = 200
"""Faults of one rule in one table that are listed one by one; the rest is told as a number."""


class Fault(NamedTuple):
    """One breach of a rule. ``row`` is the spreadsheet's number, None where the fault is not in one row."""

    table: str
    row: int | None
    column: str
    found: str
    expected: str
    message: str
    file: str = ""


class Wrong(NamedTuple):
    """What is wrong with one cell's text; where it stands is known to who reads the table."""

    expected: str
    message: str


class Rule(NamedTuple):
    """One rule: the function that finds its breaches, and whether a breach stops the work or warns."""

    check: Callable[..., Any]
    severity: str

    @property
    def name(self) -> str:
        return self.check.__name__

    @property
    def sentence(self) -> str:
        """Return the rule in words."""
        text = self.name.replace("_", " ").strip()
        return text[:1].upper() + text[1:] + "."


def stops(check: Callable[..., Any]) -> Rule:
    return Rule(check, "stops")


def warns(check: Callable[..., Any]) -> Rule:
    return Rule(check, "warns")


def problems(rule: Rule, faults: Iterable[Fault], *, file: str = "") -> list[Problem]:
    """Return a rule's faults as problems; a flood of one kind in one table is cut and counted."""
    listed: list[Problem] = []
    counts: dict[str, int] = {}
    first: dict[str, Fault] = {}
    for fault in faults:
        count = counts[fault.table] = counts.get(fault.table, 0) + 1
        if count > MOST_FAULTS:
            first.setdefault(fault.table, fault)
            continue
        listed.append(_problem(rule, fault, file))
    for table, fault in first.items():
        more = counts[table] - MOST_FAULTS
        message = f"{more:,} more of the same kind from here on; mend those listed and check again"
        listed.append(_problem(rule, fault._replace(message=message), file))
    return listed


def _problem(rule: Rule, fault: Fault, file: str) -> Problem:
    name = fault.file or file or (f"{fault.table}.csv" if fault.table else "")
    return Problem(
        name,
        fault.table,
        fault.row,
        fault.column,
        rule.severity,
        rule.name,
        shown(fault.found).strip() or "blank",
        fault.expected,
        fault.message,
    )


def shown(text: str | None, most: int = 80) -> str:
    """Return a cell's text as a message may show it: printable and short; blank for a cell that could not be read."""
    plain = "".join(c if c.isprintable() else "?" for c in (text or "")[: most + 1])
    return plain if len(plain) <= most else plain[:most] + "…"


def nearest(name: str, known: Iterable[str]) -> str:
    """Return the known name that looks most like ``name``, or an empty string."""
    by_fold = {item.casefold(): item for item in known}
    close = difflib.get_close_matches(name.strip().casefold()[:60], list(by_fold), n=1, cutoff=0.6)
    return by_fold[close[0]] if close else ""


def did_you_mean(name: str, known: Iterable[str]) -> str:
    """Return ``; did you mean X?`` or an empty string."""
    close = nearest(name, known)
    return f"; did you mean {close}?" if close else ""
