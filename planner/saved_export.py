"""A saved study as files for other programs: as it lies, and its tables as CSV that a spreadsheet opens safely."""

from __future__ import annotations

import csv
import io
import shutil
import zipfile
from pathlib import Path

import pyarrow as pa
import pyarrow.parquet as pq

from planner.errors import SavedRunsError
from planner.store import Saved

FIXED_DATE = (2026, 1, 1, 0, 0, 0)
"""Every file of an archive carries this date, so that exporting twice gives the same bytes."""

FORMULA_STARTS = ("=", "+", "-", "@", "\t", "\r")


def export(saved: Saved, target: Path) -> Path:
    """Write the study to a new folder, or to an archive when ``target`` ends in .zip; return the target.

    SavedRunsError when the target exists or cannot be written.
    """
    name = f"study {saved.manifest.id}"
    if target.exists():
        raise SavedRunsError(name, f"{target} exists already", "name a file or folder that does not")
    try:
        if target.suffix.lower() == ".zip":
            _archive(saved.folder, target)
        else:
            shutil.copytree(saved.folder, target)
            for table in saved.folder.glob("*.parquet"):
                (target / f"{table.stem}.csv").write_text(_csv(pq.read_table(table)), encoding="utf-8", newline="")
    except OSError as error:
        raise SavedRunsError(name, f"{target} cannot be written ({error.strerror})", "name another place") from error
    return target


def _archive(folder: Path, target: Path) -> None:
    try:
        with zipfile.ZipFile(target, "x", zipfile.ZIP_DEFLATED) as archive:
            for path in sorted(path for path in folder.rglob("*") if path.is_file()):
                name = path.relative_to(folder).as_posix()
                archive.writestr(zipfile.ZipInfo(name, FIXED_DATE), path.read_bytes())
                if path.suffix == ".parquet":
                    text = _csv(pq.read_table(path))
                    archive.writestr(zipfile.ZipInfo(f"{path.stem}.csv", FIXED_DATE), text.encode())
    except OSError:
        target.unlink(missing_ok=True)
        raise


def _csv(table: pa.Table) -> str:
    """Return a table as CSV without its packed rows; text that begins like a formula gets a quote before it."""
    names = [name for name in table.column_names if name != "packed"]
    out = io.StringIO()
    writer = csv.writer(out)
    writer.writerow(names)
    for row in zip(*(table[name].to_pylist() for name in names), strict=True):
        writer.writerow(
            [f"'{cell}" if isinstance(cell, str) and cell[:1] in "=+-@\t\r" and cell else cell for cell in row]
        )
    return out.getvalue()
