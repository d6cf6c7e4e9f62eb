"""The question ``fit``: what a fleet's own records say of margins and hazards, how sure that is, and tables to use."""

from __future__ import annotations

from pathlib import Path
from typing import Any, NamedTuple

from planner import fit_write
from planner.assemble import assemble
from planner.checks.rules import check
from planner.fit_hazard_answer import HazardTables, hazard_tables
from planner.fit_hazard_records import stretches
from planner.fit_margin_answer import MarginTables, margin_sentences, margin_tables
from planner.fit_margin_events import NOT_TOLD
from planner.fit_margin_records import groups
from planner.records import Records
from sim.errors import RecordsError, RequestError

NEVER_TOLD = (
    "readings tell an engine's loss, never which module lost it: the modules' shares stay those of the table wear"
)
PROMISE = "margin forecasts are statistics and defer no inspection"


class FitAnswer(NamedTuple):
    """Result tables by name (hazards, margins, margin_types, steps, trends, ahead), what they say in words, what was
    assumed, and the records they come from."""

    tables: dict[str, list[dict[str, Any]]]
    sentences: list[str]
    warnings: list[str]
    records: Records

    @property
    def inputs(self) -> str:
        return self.records.fingerprint


def ask(fleet: Path) -> FitAnswer:
    """Return the answer for a folder or workbook.

    Raises RecordsError with every problem that stops the work, RequestError where there is nothing to fit.
    """
    records, found = check(fleet)
    stopping = tuple(problem for problem in found if problem.severity == "stops")
    if stopping:
        raise RecordsError(stopping)
    return of_records(records)


def of_records(records: Records) -> FitAnswer:
    """Return the answer for records without problems that stop; raises as ``ask`` does."""
    if not len(records["margins"]) and not len(records["removals"]):
        raise RequestError(
            "records to fit",
            "neither margins nor removals",
            "rows in margins.csv or removals.csv",
            "add readings of the margin, or past removals; spoolwright template shows their columns",
        )
    fleet = assemble(records)
    found, left_out = groups(records, fleet)
    margins = margin_tables(found, fleet)
    past, notes = stretches(records, fleet)
    hazards = hazard_tables(fleet, past) if past else HazardTables([], [], [])
    planned = sum(one.number in group.washed_by_plan for group in found for one in group.current)
    warnings = [*left_out, *notes, *hazards.warnings]
    if planned:
        warnings.append(f"{planned} engines have no wash marked in their readings: washed by their base's plan")
    if not len(records["removals"]):
        warnings.append("removals.csv is missing: no hazard is fitted")
    if not len(records["margins"]):
        warnings.append("margins.csv is missing: no margin is fitted")
    else:
        warnings += [NEVER_TOLD, PROMISE]
    return FitAnswer(_tables(margins, hazards), _sentences(margins, hazards), warnings, records)


def _tables(margins: MarginTables, hazards: HazardTables) -> dict[str, list[dict[str, Any]]]:
    return {
        "hazards": hazards.hazards,
        "margins": margins.margins,
        "margin_types": margins.types,
        "steps": margins.steps,
        "trends": hazards.trends,
        "ahead": margins.ahead,
    }


def _sentences(margins: MarginTables, hazards: HazardTables) -> list[str]:
    sentences = margin_sentences(margins)
    unknown = [row["engine_serial"] for row in margins.steps if row["explained"].startswith(NOT_TOLD)]
    if unknown:
        sentences.append(f"Lasting steps that no record explains: {len(unknown)} ({', '.join(unknown[:6])}).")
    for row in hazards.trends:
        if row["verdict"] != "no trend to be seen":
            sentences.append(f"Type {row['engine_type']}, {row['cause']}: removals come {row['verdict']}.")
    worn = [row for row in hazards.hazards if row["shape_low"] is not None and row["shape_low"] > 1.0]
    if worn:
        named = ", ".join(f"{row['engine_type']} {row['module']} {row['cause']} ({row['run']})" for row in worn[:6])
        sentences.append(f"Wearing out beyond doubt: {named}.")
    return sentences


def write(answer: FitAnswer, folder: Path, *, fleet: Path) -> list[Path]:
    """Write the fitted tables into a folder and return the files.

    Raises RequestError rather than write over anything.
    """
    tables = {}
    if answer.tables["hazards"]:
        tables["hazards"] = fit_write.hazard_rows(answer.records, answer.tables["hazards"])
    if answer.tables["margin_types"]:
        tables["wear"] = fit_write.wear_rows(answer.records, answer.tables["margin_types"])
    return fit_write.write(folder, tables, fleet=fleet)
