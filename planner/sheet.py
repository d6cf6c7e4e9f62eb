"""One table as text: headings and cells, from the bytes of a file."""

from __future__ import annotations

import codecs
import csv
import io
from typing import NamedTuple

MOST_BYTES = 64_000_000
"""A larger file is refused unread: 100,000 parts with their history take under 20 MB."""
MOST_ROWS = 1_000_000
MOST_COLUMNS = 200
DELIMITERS = (",", ";", "\t", "|")


class Source(NamedTuple):
    """A file before it is understood. ``data`` is empty where the file is too large to be read."""

    table: str
    file: str
    size: int
    data: bytes


class Sheet(NamedTuple):
    """A table as text; ``numbers`` are the rows that a spreadsheet shows (headings are row 1)."""

    table: str
    file: str
    headings: tuple[str, ...]
    rows: list[list[str]]
    numbers: list[int]


def without_mark(data: bytes) -> bytes:
    """Return the bytes without the mark that some spreadsheets write before UTF-8."""
    return data[len(codecs.BOM_UTF8) :] if data.startswith(codecs.BOM_UTF8) else data


def delimiter_of(data: bytes) -> str:
    """Return the character that parts the cells of the first line: the most frequent of the usual ones."""
    end = data.find(b"\n")
    first = data[: end if 0 <= end < 20_000 else 20_000].decode("utf-8", errors="replace")
    return max(DELIMITERS, key=lambda mark: (first.count(mark), mark == ","))


def sheet_of(source: Source) -> Sheet:
    """Return a file's rows; blank rows are left out, and cells stay as written.

    Raises csv.Error where quotes are left open or a cell is absurdly long.
    """
    text = without_mark(source.data).decode("utf-8")
    reader = csv.reader(io.StringIO(text, newline=""), delimiter=delimiter_of(source.data), strict=True)
    headings: tuple[str, ...] | None = None
    rows: list[list[str]] = []
    numbers: list[int] = []
    for number, cells in enumerate(reader, start=1):
        if not any(cells):
            continue
        if headings is None:
            headings = tuple(cells)
            continue
        rows.append(cells)
        numbers.append(number)
        if len(rows) > MOST_ROWS:
            raise csv.Error(f"more than {MOST_ROWS:,} rows")
    return Sheet(source.table, source.file, headings or (), rows, numbers)
