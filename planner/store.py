"""Saved studies: one folder a study, built aside and renamed last, never changed after.

    HOME/studies/ID/manifest.json   what went in, by what it was computed, the answer in short, a hash of each file
                   inputs/…         the tables as they were
                   rows.parquet     one row a strategy and run: its figures, and the packed row to the last bit
                   NAME.parquet     further tables of the answer

A folder with its final name is whole: a crash leaves only a folder whose name begins with a dot, which nobody reads.
Two that save the same study at once write the same content, and the first to rename wins.
"""

from __future__ import annotations

import hashlib
import os
import shutil
import time
from collections.abc import Callable, Mapping
from pathlib import Path
from typing import Any, NamedTuple, TypeVar

import pyarrow as pa
import pyarrow.parquet as pq

from planner.chunk import Task
from planner.errors import SavedRunsError
from planner.manifest import Manifest, from_json, to_json
from planner.rows import pack, unpack
from planner.store_index import Index

R = TypeVar("R")

STALE_SECONDS = 24 * 3600.0


class Saved(NamedTuple):
    """A study at rest."""

    manifest: Manifest
    folder: Path

    def rows(self, row_type: type[R]) -> dict[Task, R]:
        """Return every row by its task, in the order in which they were saved."""
        return {task: unpack(blob, row_type) for task, blob in self.packed().items()}

    def packed(self) -> dict[Task, bytes]:
        """Return every row as the bytes that stand for it."""
        table = pq.read_table(self.folder / "rows.parquet", columns=["strategy", "run", "packed"])
        columns = (table[name].to_pylist() for name in table.column_names)
        return {(strategy, run): blob for strategy, run, blob in zip(*columns, strict=True)}

    def table(self, name: str, *, columns: list[str] | None = None, filters: Any = None) -> pa.Table:
        """Return a table, or those columns and rows of it that are asked for; only these are read."""
        path = self.folder / f"{name}.parquet"
        if not path.is_file():
            there = ", ".join(sorted(file.stem for file in self.folder.glob("*.parquet")))
            raise SavedRunsError(f"study {self.manifest.id}", f"it has no table {name}", f"it has: {there}")
        return pq.read_table(path, columns=columns, filters=filters)


def save(
    home: Path,
    manifest: Manifest,
    *,
    inputs: Mapping[str, bytes],
    rows: Mapping[Task, Any],
    tables: Mapping[str, pa.Table] | None = None,
) -> str:
    """Save a study and return its name; once this returns, the study survives whatever happens.

    SavedRunsError when it cannot be written: then nothing of it is left.
    """
    studies = home / "studies"
    final = studies / manifest.id
    aside = studies / f".building-{os.getpid()}-{time.monotonic_ns()}"
    try:
        studies.mkdir(parents=True, exist_ok=True)
        _sweep(studies)
        if not final.exists():
            _build(aside, manifest, inputs=inputs, tables={"rows": _rows_table(rows), **(tables or {})})
            _rename(aside, final)
        Index(home).put(manifest)
    except OSError as error:
        shutil.rmtree(aside, ignore_errors=True)
        remedy = "make room or set SPOOLWRIGHT_HOME to a place that can be written; the figures themselves are not lost"
        raise SavedRunsError("this study is not saved", error.strerror or str(error), remedy) from error
    return manifest.id


def studies(home: Path) -> list[Manifest]:
    """Return the saved studies, newest first; folders that are damaged are left out (``load`` says why)."""
    named = Index(home).synchronised(read=lambda name: _manifest_or_none(home / "studies" / name))
    return sorted(named, key=lambda manifest: (manifest.made_at, manifest.id), reverse=True)


def load(home: Path, name: str) -> Saved:
    """Return the study whose name begins with ``name``, checked against its hashes; SavedRunsError otherwise."""
    folders = _folders(home)
    found = [folder for folder in folders if name and folder.name.startswith(name)]
    if len(found) != 1:
        why = "no saved study has this name" if not found else f"{len(found)} saved studies begin so"
        listed = ", ".join(folder.name for folder in (found or folders)[:5]) or "none is saved yet"
        raise SavedRunsError(f"study {name}", why, f"saved are: {listed}")
    (folder,) = found
    try:
        manifest, files = from_json((folder / "manifest.json").read_text(encoding="utf-8"))
        damaged = [file for file, digest in files.items() if _digest(folder / file) != digest]
    except (OSError, ValueError) as error:
        raise SavedRunsError(f"study {folder.name}", f"it is damaged ({error})", "delete it and run it again") from None
    if damaged or manifest.id != folder.name:
        why = f"it is damaged: {', '.join(damaged) or 'its name'} is not what was saved"
        raise SavedRunsError(f"study {folder.name}", why, "delete it and run it again")
    return Saved(manifest, folder)


def delete(home: Path, name: str) -> str:
    """Delete the study whose name begins with ``name``, damaged or not; return its whole name."""
    found = [folder for folder in _folders(home) if name and folder.name.startswith(name)]
    if len(found) != 1:
        load(home, name)  # says what is wrong with the name
    (folder,) = found
    aside = folder.with_name(f".deleted-{folder.name}-{time.monotonic_ns()}")
    folder.rename(aside)
    shutil.rmtree(aside, ignore_errors=True)
    Index(home).drop(folder.name)
    return folder.name


def _folders(home: Path) -> list[Path]:
    studies = home / "studies"
    if not studies.is_dir():
        return []
    return sorted(folder for folder in studies.iterdir() if not folder.name.startswith("."))


def _manifest_or_none(folder: Path) -> Manifest | None:
    try:
        manifest, _ = from_json((folder / "manifest.json").read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return None
    return manifest if manifest.id == folder.name else None


def _rows_table(rows: Mapping[Task, Any]) -> pa.Table:
    """Return rows as a table: strategy, run, each plain figure, and the packed row."""
    tasks, values = list(rows), list(rows.values())
    columns: dict[str, list[Any]] = {"strategy": [task[0] for task in tasks], "run": [task[1] for task in tasks]}
    for at, name in enumerate(values[0]._fields if values else ()):
        if all(isinstance(row[at], (bool, int, float, str)) for row in values) and name not in columns:
            columns[name] = [row[at] for row in values]
    return pa.table({**columns, "packed": [pack(row) for row in values]})


def _build(folder: Path, manifest: Manifest, *, inputs: Mapping[str, bytes], tables: Mapping[str, pa.Table]) -> None:
    """Write every file of a study and bring each to the disk itself, the manifest last."""
    (folder / "inputs").mkdir(parents=True)
    files: dict[str, str] = {}

    def write(name: str, fill: Callable[[Path], object]) -> None:
        path = folder / name
        fill(path)
        with path.open("rb") as file:
            os.fsync(file.fileno())
        files[name] = _digest(path)

    for name, content in inputs.items():
        write(f"inputs/{name}", lambda path, content=content: path.write_bytes(content))  # type: ignore[misc]
    for name, table in tables.items():
        write(f"{name}.parquet", lambda path, table=table: pq.write_table(table, path))  # type: ignore[misc]
    text = to_json(manifest, dict(files))
    write("manifest.json", lambda path: path.write_text(text, encoding="utf-8"))
    _flush_folder(folder / "inputs")
    _flush_folder(folder)


def _rename(aside: Path, final: Path) -> None:
    """Give the folder its name; when another process was first with the same content, drop this one."""
    try:
        aside.rename(final)
    except OSError:
        if not final.exists():
            raise
        shutil.rmtree(aside)
    _flush_folder(final.parent)


def _flush_folder(folder: Path) -> None:
    if os.name == "nt":
        return  # folders cannot be opened there
    handle = os.open(folder, os.O_RDONLY)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)


def _digest(path: Path) -> str:
    with path.open("rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()


def _sweep(studies: Path) -> None:
    """Remove what crashes left behind, once it is too old to be somebody's work in progress."""
    for folder in studies.glob(".*"):
        try:
            if time.time() - folder.stat().st_mtime > STALE_SECONDS:
                shutil.rmtree(folder, ignore_errors=True)
        except OSError:
            continue
