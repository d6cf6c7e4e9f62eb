"""Blank tables to fill in, and a fleet's tables turned from folder to workbook or back, to the last character."""

from __future__ import annotations

import csv
import os
import shutil
from collections.abc import Sequence
from pathlib import Path

from planner.schema.registry import TABLES
from planner.sheet import Sheet
from planner.table_docs import tables_text
from planner.tables import WORKBOOK_ENDINGS, open_sheets
from sim.errors import RecordsError, RequestError


def blank_sheets() -> list[Sheet]:
    """Return every table with all its columns and one example row."""
    return [
        Sheet(name, f"{name}.csv", table.names, [[column.example for column in table.columns]], [2])
        for name, table in TABLES.items()
    ]


def write(target: Path, source: Path | None = None) -> int:
    """Write blank tables, or those of ``source``, to a new folder or workbook; return how many tables were written.

    The form follows the target's name. Raises RequestError where the target is taken or the source is no fleet,
    RecordsError where a table of the source cannot be read as one.
    """
    if target.suffix.lower() in (".xls", ".csv", ".ods", ".xlsm"):
        raise RequestError("target", target.name, "a folder, or a workbook that ends in .xlsx")
    if target.exists() and (target.is_file() or any(target.iterdir())):
        raise RequestError("target", str(target), "a new name or an empty folder", "nothing is overwritten")
    sheets = blank_sheets() if source is None else _sheets_of(source)
    target.parent.mkdir(parents=True, exist_ok=True)
    aside = target.with_name(f".{target.name}.{os.getpid()}.part")
    try:
        if target.suffix.lower() in WORKBOOK_ENDINGS:
            from planner.workbook import write_workbook  # a folder is written without the workbook library

            write_workbook(aside, sheets)
        else:
            write_folder(aside, sheets)
            if source is None:
                (aside / "TABLES.md").write_text(tables_text(), encoding="utf-8")
        if target.is_dir():
            target.rmdir()
        aside.replace(target)
    except OSError as error:
        raise RequestError("target", f"{target}: {error}", "a place that can be written") from error
    finally:
        if aside.is_dir():
            shutil.rmtree(aside, ignore_errors=True)
        else:
            aside.unlink(missing_ok=True)
    return len(sheets)


def _sheets_of(source: Path) -> list[Sheet]:
    opened = open_sheets(source)
    lost = tuple(p for p in opened.found if p.severity == "stops" and p.table in opened.unreadable)
    if lost:
        raise RecordsError(lost)
    return opened.sheets


def write_folder(folder: Path, sheets: Sequence[Sheet]) -> None:
    """Write one CSV file a table."""
    folder.mkdir(parents=True)
    for sheet in sheets:
        with (folder / f"{sheet.table}.csv").open("w", encoding="utf-8", newline="") as file:
            writer = csv.writer(file, lineterminator="\n")
            writer.writerow(sheet.headings)
            writer.writerows(sheet.rows)
