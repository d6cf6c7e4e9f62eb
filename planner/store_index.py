"""A list of the saved studies, so that listing thousands opens one file; it can be lost and rebuilt at any time.

SQLite in WAL mode: the command line and the screen read and write at once. The folders are the truth. What stands here
and not there is dropped, what stands there and not here is added, and a damaged index is made anew.
"""

from __future__ import annotations

import sqlite3
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from pathlib import Path

from planner.manifest import Manifest, from_json, to_json

BUSY_SECONDS = 10.0


class Index:
    """The index of one home."""

    def __init__(self, home: Path) -> None:
        self._home = home
        self._path = home / "index.sqlite"

    def put(self, manifest: Manifest) -> None:
        """Add a study; a study that cannot be added now is added when somebody lists."""
        try:
            with self._open() as base:
                base.execute("INSERT OR REPLACE INTO studies VALUES (?, ?)", (manifest.id, to_json(manifest, {})))
        except sqlite3.Error:
            return

    def drop(self, name: str) -> None:
        """Take a study out."""
        try:
            with self._open() as base:
                base.execute("DELETE FROM studies WHERE id = ?", (name,))
        except sqlite3.Error:
            return

    def synchronised(self, *, read: Callable[[str], Manifest | None]) -> list[Manifest]:
        """Return the manifests of all folders that are there; ``read`` is asked for those the index lacks."""
        folder = self._home / "studies"
        there = {path.name for path in folder.iterdir() if path.name[0] != "."} if folder.is_dir() else set()
        if not there and not self._path.exists():
            return []
        known = self._known()
        found = {name: known.get(name) or read(name) for name in there}
        for name in set(known) - there:
            self.drop(name)
        for name, manifest in found.items():
            if manifest is not None and name not in known:
                self.put(manifest)
        return [manifest for manifest in found.values() if manifest is not None]

    def _known(self) -> dict[str, Manifest]:
        """Return what the index holds; nothing when it is damaged, and then it is removed."""
        try:
            with self._open() as base:
                listed = base.execute("SELECT id, manifest FROM studies").fetchall()
            return {name: from_json(text)[0] for name, text in listed}
        except sqlite3.OperationalError:
            return {}  # locked for long, or on a disk that is full or read-only: the folders still answer
        except (sqlite3.DatabaseError, ValueError):
            for ending in ("", "-wal", "-shm"):
                self._path.with_name(self._path.name + ending).unlink(missing_ok=True)
            return {}

    @contextmanager
    def _open(self) -> Iterator[sqlite3.Connection]:
        base = sqlite3.connect(self._path, timeout=BUSY_SECONDS)
        try:
            base.execute("PRAGMA journal_mode = WAL")
            base.execute("CREATE TABLE IF NOT EXISTS studies (id TEXT PRIMARY KEY, manifest TEXT NOT NULL)")
            with base:
                yield base
        finally:
            base.close()
