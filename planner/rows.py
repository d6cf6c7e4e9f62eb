"""What one run leaves, as bytes: equal rows give equal bytes, and the other way round.

A row is a named tuple whose fields are numbers, text or numpy arrays of plain types. The packed form is a line of JSON
that describes the fields, then their values; it holds no code, so reading it can run none. Workers load this module:
numpy only.
"""

from __future__ import annotations

import json
from typing import Any, Protocol, TypeVar

import numpy as np


class Row(Protocol):
    """Any named tuple."""

    @property
    def _fields(self) -> tuple[str, ...]: ...
    def __iter__(self) -> Any: ...


R = TypeVar("R")

_PLAIN_KINDS = "biufUS"


def pack(row: Row) -> bytes:
    """Return the row as bytes, the same on every machine of the same byte values; TypeError for other field types."""
    fields: list[list[Any]] = []
    parts: list[bytes] = []
    for name, found in zip(row._fields, row, strict=True):
        value = found.item() if isinstance(found, np.generic) else found
        if isinstance(value, (bool, int, str)):
            fields.append([name, "json", value])
            continue
        kind = "float" if isinstance(value, float) else "array"
        array = np.asarray(value)
        if array.dtype.kind not in _PLAIN_KINDS:
            raise TypeError(f"field {name} holds {type(value).__name__} of {array.dtype}, which is no plain value")
        plain = np.ascontiguousarray(array, dtype=array.dtype.newbyteorder("<"))
        fields.append([name, kind, plain.dtype.str, list(array.shape)])
        parts.append(plain.tobytes())
    header = json.dumps(fields, ensure_ascii=False, separators=(",", ":")).encode()
    return header + b"\n" + b"".join(parts)


def unpack(blob: bytes, row_type: type[R]) -> R:
    """Return the row that ``pack`` made these bytes from; ValueError when they are of another shape of row."""
    header, _, body = blob.partition(b"\n")
    fields = json.loads(header)
    wanted = getattr(row_type, "_fields", ())
    if tuple(field[0] for field in fields) != tuple(wanted):
        raise ValueError(f"a row of {[field[0] for field in fields]} is no {row_type.__name__}")
    values: list[Any] = []
    at = 0
    for _, kind, *rest in fields:
        if kind == "json":
            values.append(rest[0])
            continue
        dtype, shape = np.dtype(rest[0]), tuple(rest[1])
        size = dtype.itemsize * int(np.prod(shape, dtype=np.int64))
        array = np.frombuffer(body[at : at + size], dtype=dtype).reshape(shape)
        values.append(float(array) if kind == "float" else array)
        at += size
    if at != len(body):
        raise ValueError(f"a row of {row_type.__name__} has {len(body)} bytes of values where its header says {at}")
    return row_type(*values)
