"""A fleet's tables as they were read: typed columns with the row numbers that a spreadsheet shows."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from typing import Any

from planner.schema.column import Table
from planner.schema.registry import TABLES


@dataclass(frozen=True, slots=True, kw_only=True)
class Rows:
    """One table. ``columns`` holds a list of typed values for each column of the schema (one that the file lacks is
    filled with its default), ``numbers`` the spreadsheet's row of each entry, ``faulty`` the cells that could not be
    read (their value is None)."""

    table: Table
    file: str
    columns: Mapping[str, list[Any]]
    numbers: list[int]
    headings: tuple[str, ...] = ()
    faulty: frozenset[tuple[int, str]] = frozenset()

    def __len__(self) -> int:
        return len(self.numbers)

    def __getitem__(self, column: str) -> list[Any]:
        return self.columns[column]

    def pick(self, *names: str) -> Iterator[tuple[Any, ...]]:
        """Yield for each row its spreadsheet number and the values of the named columns."""
        return zip(self.numbers, *(self.columns[name] for name in names), strict=True)


@dataclass(frozen=True, slots=True, kw_only=True)
class Records:
    """All tables of a fleet. ``unreadable`` names tables whose file could not be read at all; ``fingerprint`` stands
    for the contents of every file read."""

    source: str
    tables: Mapping[str, Rows]
    settings: Mapping[str, Any]
    fingerprint: str = ""
    unreadable: frozenset[str] = field(default=frozenset())

    def __getitem__(self, table: str) -> Rows:
        return self.tables[table]

    def given(self, table: str) -> bool:
        """Return whether the table's file is there."""
        return bool(self.tables[table].file)


def empty_rows(name: str) -> Rows:
    """Return a table that is not there."""
    table = TABLES[name]
    return Rows(table=table, file="", columns={column: [] for column in table.names}, numbers=[])


def inputs_fingerprint(records: Records) -> str:
    """Return 64 hexadecimal digits that stand for what was read."""
    return records.fingerprint
