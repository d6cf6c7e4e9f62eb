"""What went in, as a hash: of values, of a folder of tables, of the program's own sources.

Two values have the same fingerprint when they have the same types and contents, whatever the order of a mapping and
whichever process made them. Workers load this module: numpy only.
"""

from __future__ import annotations

import dataclasses
import hashlib
import struct
from collections.abc import Callable, Mapping, Set
from datetime import date
from enum import Enum
from fractions import Fraction
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np

TABLE_ENDINGS = (".csv", ".xlsx")


def of(*values: Any) -> str:
    """Return 64 hexadecimal digits that stand for the values' contents; TypeError where a value has no content."""
    digest = hashlib.sha256()
    for value in values:
        _feed(digest.update, value)
    return digest.hexdigest()


def _feed(update: Callable[[bytes], None], value: Any) -> None:
    """Feed one value: a tag for its type, its size, its content; so that no two values run into each other."""
    if value is None or isinstance(value, (bool, int, Fraction)):
        _text(update, type(value).__name__, str(value))
    elif isinstance(value, float):
        update(b"float" + struct.pack("<d", value))
    elif isinstance(value, str):
        _text(update, "str", value)
    elif isinstance(value, bytes):
        update(b"bytes%d:" % len(value) + value)
    elif isinstance(value, Enum):
        _text(update, type(value).__qualname__, value.name)
    elif isinstance(value, date):
        _text(update, type(value).__name__, value.isoformat())
    elif isinstance(value, (np.ndarray, np.generic)):
        _array(update, np.asarray(value))
    elif isinstance(value, tuple) and hasattr(value, "_fields"):
        _text(update, type(value).__qualname__, ",".join(value._fields))
        _many(update, list(value))
    elif dataclasses.is_dataclass(value) and not isinstance(value, type):
        names = [field.name for field in dataclasses.fields(value)]
        _text(update, type(value).__qualname__, ",".join(names))
        _many(update, [getattr(value, name) for name in names])
    elif isinstance(value, (list, tuple)):
        _many(update, list(value))
    elif isinstance(value, Mapping):
        update(b"mapping")
        _many(update, sorted(of(key) + of(item) for key, item in value.items()))
    elif isinstance(value, Set):
        update(b"set")
        _many(update, sorted(of(item) for item in value))
    else:
        raise TypeError(f"a {type(value).__qualname__} has no content that a fingerprint could stand for")


def _text(update: Callable[[bytes], None], tag: str, text: str) -> None:
    raw = text.encode()
    update(f"{tag}{len(raw)}:".encode() + raw)


def _many(update: Callable[[bytes], None], values: list[Any]) -> None:
    update(b"many%d:" % len(values))
    for value in values:
        _feed(update, value)


def _array(update: Callable[[bytes], None], array: np.ndarray) -> None:
    if array.dtype.kind not in "biufUSM":
        raise TypeError(f"an array of {array.dtype} has no content that a fingerprint could stand for")
    plain = np.ascontiguousarray(array, dtype=array.dtype.newbyteorder("<"))
    _text(update, "array", f"{plain.dtype.str}{array.shape}")
    update(plain.tobytes())


def files(contents: Mapping[str, bytes]) -> str:
    """Return the fingerprint of named files."""
    return of({name: hashlib.sha256(content).hexdigest() for name, content in contents.items()})


def tables_of(path: Path) -> dict[str, bytes]:
    """Return the files that a fleet's folder (or its one workbook) is read from, by name; subfolders are ignored."""
    if path.is_file():
        return {path.name: path.read_bytes()}
    found = sorted(path.iterdir())
    return {file.name: file.read_bytes() for file in found if file.is_file() and file.suffix.lower() in TABLE_ENDINGS}


def folder(path: Path) -> str:
    """Return the fingerprint of a fleet's folder or workbook."""
    return files(tables_of(path))


@cache
def sources() -> str:
    """Return the fingerprint of the program's own sources, those that can change a figure: all of sim and planner."""
    root = Path(__file__).resolve().parents[1]
    paths = sorted(path for layer in ("sim", "planner") for path in (root / layer).rglob("*.py"))
    return files({path.relative_to(root).as_posix(): path.read_bytes() for path in paths})
