"""Fitted figures as tables in the fleet's own form, ``hazards.csv`` and ``wear.csv``, for the simulation to use as is.

The tables are whole: rows that the records say nothing of stand as in the fleet's tables. Written into a folder of the
user's choice and never over a file that is there.
"""

from __future__ import annotations

import csv
import os
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from planner.records import Records
from planner.schema.registry import TABLES
from sim.errors import RequestError
from sim.fleet import Hazard

Row = dict[str, Any]

STEADY = (
    "loss_degC_per_1000_cycles",
    "loss_degC_per_1000_hours",
    "eff_frac_per_1000_cycles",
    "eff_frac_per_1000_hours",
)
EARLY = ("early_loss_degC", "early_loss_eff_frac")


def rows_in(records: Records, table: str) -> list[Row]:
    """Return a table's rows as they were read, by column."""
    columns = records[table].columns
    return [dict(zip(columns, values, strict=True)) for values in zip(*columns.values(), strict=True)]


def hazard_rows(records: Records, fitted: Sequence[Mapping[str, Any]]) -> list[Row]:
    """Return the table ``hazards`` with fitted shapes, scales and early chances in place of the fleet's."""
    found = {(row["engine_type"], row["module"], row["cause"], row["run"]): row for row in fitted}
    rows = rows_in(records, "hazards")
    for row in rows:
        fit = found.pop((row["engine_type"], row["module"], row["cause"], row["run"]), None)
        if fit is None:
            continue
        if fit["scale"] is not None:
            row |= {"shape": _short(fit["shape"]), "scale": _short(fit["scale"])}
        if fit["within_chance"]:
            row |= {"probability_within": _short(fit["within_chance"])}
    blank = dict.fromkeys(TABLES["hazards"].names)
    defaults = {column.name: column.default for column in TABLES["hazards"].columns}
    for (kind, module, cause, run), fit in found.items():
        if fit["scale"] is not None:
            law = Hazard(engine_type=kind, module=module, cause=cause, run=run)
            keys = {"engine_type": kind, "module": module, "cause": cause, "run": run}
            figures = {"shape": _short(fit["shape"]), "scale": _short(fit["scale"]), "clock": fit["clock"]}
            rows.append(blank | defaults | keys | figures | {"counted_from": law.counted_from})
    return rows


def wear_rows(records: Records, types: Sequence[Mapping[str, Any]]) -> list[Row]:
    """Return the table ``wear`` with steady and early loss moved to what the readings say, by type and rating.

    Readings tell the engine's loss, not which module lost it: the shares of the modules stay the table's.
    """
    factors = {(row["engine_type"], row["rating"]): wear_factors(row) for row in types}
    rows = rows_in(records, "wear")
    for row in rows:
        steady, early = factors.get((row["engine_type"], row["rating"]), (1.0, 1.0))
        for columns, factor in ((STEADY, steady), (EARLY, early)):
            row |= {name: _short(row[name] * factor) for name in columns if row.get(name)}
    return rows


def wear_factors(row: Mapping[str, Any]) -> tuple[float, float]:
    """Return by what the table's steady and early loss are to be multiplied (never below zero)."""
    pairs = (
        (row["rate_degC_per_1000_cycles"], row["table_rate_degC_per_1000_cycles"]),
        (row["early_loss_degC"], row["table_early_loss_degC"]),
    )
    steady, early = (max(0.0, found / table) if table > 0.0 else 1.0 for found, table in pairs)
    return steady, early


def write(folder: Path, tables: Mapping[str, Sequence[Row]], *, fleet: Path) -> list[Path]:
    """Write tables as CSV into a folder and return the files.

    Raises RequestError when the folder is the fleet's own, cannot be one, or holds a file of that name already; then
    nothing is written.
    """
    remedy = "name a new folder; copy what you want of it into the fleet yourself"
    if folder.resolve() in (fleet.resolve(), fleet.resolve().parent if fleet.is_file() else None):
        raise RequestError("--write", str(folder), "another folder than the fleet's", remedy)
    targets = {name: folder / f"{name}.csv" for name in tables}
    taken = [path.name for path in targets.values() if path.exists()]
    if taken:
        raise RequestError("--write", f"{folder} with {', '.join(taken)}", "a folder without them", remedy)
    try:
        folder.mkdir(parents=True, exist_ok=True)
        for name, path in targets.items():
            _write_one(path, name, tables[name])
    except OSError as error:
        raise RequestError(
            "--write", f"{folder} ({error.strerror or error})", "a folder that can be written"
        ) from error
    return list(targets.values())


def _write_one(path: Path, name: str, rows: Sequence[Row]) -> None:
    """Write a table aside and move it into place, so that no half of it is ever read."""
    table = TABLES[name]
    used = [c.name for c in table.columns if c.required or any(_text(row.get(c.name)) for row in rows)]
    aside = path.with_name(f".{path.name}.{os.getpid()}.part")
    try:
        with aside.open("w", encoding="utf-8", newline="") as file:
            writer = csv.writer(file, lineterminator="\n")
            writer.writerow(used)
            writer.writerows([_text(row.get(column)) for column in used] for row in rows)
        # a link fails where a file has come meanwhile, a rename would replace it
        os.link(aside, path)
    finally:
        aside.unlink(missing_ok=True)


def _short(value: float) -> float:
    """Return a fitted figure to seven digits, far beyond what the records can tell; figures of the fleet stay whole."""
    return float(f"{value:.7g}")


def _text(value: Any) -> str:
    if value is None:
        return ""
    if isinstance(value, float):
        return repr(int(value)) if value.is_integer() else repr(value)
    return str(value)
