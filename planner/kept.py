"""Rows kept as they arrive: the journal of a running study and the cache of what was computed before, in one.

A folder for each strategy of each study's content (its key), a file for each process that ever wrote there, a frame
for each row: length, checksum, run, row. A file has one writer and is only appended to, so a crash can damage its last
frame alone, and a reader at the same time sees whole frames. A row depends on nothing but its key and run number, so
that rows found twice are the same.
"""

from __future__ import annotations

import json
import os
import shutil
import struct
import time
import zlib
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Any, Generic, TypeVar

from planner.chunk import Task
from planner.rows import pack, unpack

R = TypeVar("R")

_FRAME = struct.Struct("<4sIII")
_MAGIC = b"swr1"

FLUSH_SECONDS = 1.0

MOST_BYTES = 2_000_000_000
"""Beyond it the folders that were used longest ago are dropped; a user's saved studies are never touched."""


class Kept(Generic[R]):
    """The rows of one study that are at hand, by task; ``task[0]`` names the strategy, the rest the run.

    ``keys`` gives each strategy's key: the fingerprint of all that its rows depend on. When the disk is full the rows
    go on in memory and ``trouble`` says so.
    """

    def __init__(self, home: Path, keys: Mapping[str, str], row_type: type[R]) -> None:
        self._row_type = row_type
        self._folders = {strategy: home / "kept" / key for strategy, key in keys.items()}
        self._files: dict[str, int] = {}
        self._flushed = time.monotonic()
        self._blobs: dict[Task, bytes] = {}
        self.trouble: str | None = None
        for strategy, folder in self._folders.items():
            for run, blob in _read(folder):
                self._blobs[(strategy, *run)] = blob

    def __enter__(self) -> Kept[R]:
        return self

    def __exit__(self, *_: object) -> None:
        self.close()

    def __contains__(self, task: Task) -> bool:
        return task in self._blobs

    def count(self) -> int:
        """Return how many rows are at hand."""
        return len(self._blobs)

    def get(self, task: Task) -> R | None:
        """Return the row of a task, or None when it is not at hand."""
        blob = self._blobs.get(task)
        return None if blob is None else unpack(blob, self._row_type)

    def put(self, task: Task, row: Any) -> None:
        """Keep a row; once this returns, the row survives the end of this process, and within a second a power cut."""
        blob = pack(row)
        self._blobs[task] = blob
        if self.trouble is not None:
            return
        run = json.dumps(task[1:]).encode()
        check = zlib.crc32(blob, zlib.crc32(run))
        frame = _FRAME.pack(_MAGIC, len(run), len(blob), check) + run + blob
        try:
            _write_all(self._file(task[0]), frame)
            if time.monotonic() - self._flushed > FLUSH_SECONDS:
                self._flush()
        except OSError as error:
            self.trouble = f"finished runs can no longer be written ({error.strerror}): they are kept in memory only"

    def close(self) -> None:
        """Bring what was written to the disk itself, and make room when the rows of old studies take too much."""
        try:
            self._flush()
        except OSError as error:
            self.trouble = f"finished runs may not have reached the disk ({error.strerror})"
        for file in self._files.values():
            os.close(file)
        self._files.clear()
        for folder in self._folders.values():
            if folder.is_dir():
                os.utime(folder)
                drop_oldest(folder.parent, most_bytes=MOST_BYTES)

    def _flush(self) -> None:
        self._flushed = time.monotonic()
        for file in self._files.values():
            os.fsync(file)

    def _file(self, strategy: str) -> int:
        if strategy not in self._files:
            folder = self._folders[strategy]
            folder.mkdir(parents=True, exist_ok=True)
            name = f"{os.getpid()}-{time.time_ns()}.rows"
            self._files[strategy] = os.open(folder / name, os.O_WRONLY | os.O_CREAT | os.O_EXCL | os.O_APPEND, 0o600)
        return self._files[strategy]


def _write_all(file: int, data: bytes) -> None:
    """Write every byte; a disk that fills up takes a part of them first and only then says that it is full."""
    while data:
        data = data[os.write(file, data) :]


def _read(folder: Path) -> Iterator[tuple[Task, bytes]]:
    """Yield run and row of every whole frame in a key's folder."""
    for path in sorted(folder.glob("*.rows")):
        content = path.read_bytes()
        at = 0
        while at + _FRAME.size <= len(content):
            magic, run_size, row_size, check = _FRAME.unpack_from(content, at)
            at += _FRAME.size
            run, blob = content[at : at + run_size], content[at + run_size : at + run_size + row_size]
            at += run_size + row_size
            if magic != _MAGIC or at > len(content) or zlib.crc32(blob, zlib.crc32(run)) != check:
                break  # the writer was stopped here: nothing whole can follow
            yield tuple(json.loads(run)), blob


def drop_oldest(folder: Path, *, most_bytes: int) -> None:
    """Remove the keys that were used longest ago until the rest fits."""
    sizes = []
    for key in folder.iterdir():
        try:
            sizes.append((key.stat().st_mtime, sum(path.stat().st_size for path in key.iterdir()), key))
        except OSError:
            continue  # another process is at it
    held = sum(size for _, size, _ in sizes)
    for _, size, key in sorted(sizes):
        if held <= most_bytes:
            return
        shutil.rmtree(key, ignore_errors=True)
        held -= size
