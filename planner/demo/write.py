"""Writing the demo's tables: one CSV a table, headings in the schema's order, nothing half written."""

from __future__ import annotations

import csv
import os
import shutil
from pathlib import Path
from typing import Any

from planner.schema.registry import TABLES
from sim.errors import RequestError


def write_tables(folder: Path, tables: dict[str, list[dict[str, Any]]]) -> None:
    """Write tables into an existing folder; columns that no row fills are left out unless they are required."""
    for name in TABLES:
        rows = tables.get(name)
        if not rows:
            continue
        table = TABLES[name]
        unknown = {key for row in rows for key in row} - set(table.names)
        if unknown:
            raise ValueError(f"{name} has no column {', '.join(sorted(unknown))}")
        used = [
            c.name for c in table.columns if c.required or any(row.get(c.name, "") not in ("", None) for row in rows)
        ]
        with (folder / f"{name}.csv").open("w", encoding="utf-8", newline="") as file:
            writer = csv.writer(file, lineterminator="\n")
            writer.writerow(used)
            writer.writerows([_text(row.get(column)) for column in used] for row in rows)


def _text(value: Any) -> str:
    if value is None:
        return ""
    if isinstance(value, float):
        return repr(int(value)) if value.is_integer() else repr(round(value, 6))
    return str(value)


def new_folder(folder: Path) -> Path:
    """Return a folder beside the one asked for, to be moved there when it is whole.

    Raises RequestError when the place is taken by anything but an empty folder.
    """
    if folder.exists() and (not folder.is_dir() or any(folder.iterdir())):
        raise RequestError("folder", str(folder), "a new or empty folder", "name another one, or empty it first")
    folder.parent.mkdir(parents=True, exist_ok=True)
    aside = folder.parent / f".{folder.name}.{os.getpid()}.part"
    shutil.rmtree(aside, ignore_errors=True)
    aside.mkdir()
    return aside


def move_into_place(aside: Path, folder: Path) -> None:
    """Put the finished folder where it was asked for."""
    if folder.exists():
        folder.rmdir()
    aside.replace(folder)
