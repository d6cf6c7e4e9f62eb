"""A fleet's folder or workbook, read into typed tables with every problem found on the way.

The standard csv reader and own rules: row numbers stay those of a spreadsheet, a decimal comma does not shift columns
unseen, and nothing is guessed. Cells that cannot be read are None and told; rules on whole records come after
(``planner.checks.rules``).
"""

from __future__ import annotations

import csv
from collections.abc import Iterable, Sequence
from pathlib import Path
from typing import Any, NamedTuple

from planner import fingerprint
from planner.cells import NotReadableError, default_of, value_in
from planner.checks.cells import broken_rule
from planner.checks.fault import Fault, Rule, Wrong, did_you_mean, problems, stops, warns
from planner.checks.files import BYTE_RULES, FORM_RULES, ROW_RULE, SIZE_RULE
from planner.checks.headings import HEADING_RULES
from planner.records import Records, Rows, empty_rows
from planner.schema.column import Column
from planner.schema.registry import TABLES
from planner.settings import settings_in
from planner.sheet import MOST_BYTES, Sheet, Source, sheet_of
from sim.errors import Problem, RequestError

WORKBOOK_ENDINGS = (".xlsx", ".xlsm")
_TABULAR = {".csv", ".tsv", ".tab", ".txt", ".xls", ".xlsx", ".xlsm", ".ods", ".parquet"}


def cells_have_no_stray_spaces(sheet: Sheet, column: str, rows: Iterable[tuple[int, str]]) -> list[Fault]:
    message = "the cell has spaces around it; read without them, take them out"
    return [
        Fault(sheet.table, row, column, f'"{text}"', f'"{text.strip()}"', message, sheet.file)
        for row, text in rows
        if text != text.strip()
    ]


class Listing(NamedTuple):
    """What a folder or workbook holds: names of tables and others, and how a table's place is written."""

    names: Sequence[str]
    pattern: str = "{}.csv"


def files_are_known_tables(listing: Listing) -> list[Fault]:
    message = "the table is not known and is not read"
    return [
        Fault(
            "",
            None,
            "",
            name,
            "a table of TABLES.md",
            message + did_you_mean(name, TABLES),
            listing.pattern.format(name),
        )
        for name in listing.names
        if name not in TABLES
    ]


def needed_tables_are_there(listing: Listing) -> list[Fault]:
    strangers = [name for name in listing.names if name not in TABLES]
    return [
        Fault(
            name,
            None,
            "",
            "no table",
            listing.pattern.format(name),
            f"the table is missing (a row is {table.row}); add it{did_you_mean(name, strangers)}",
            listing.pattern.format(name),
        )
        for name, table in TABLES.items()
        if table.needed and name not in listing.names
    ]


def needed_tables_hold_rows(sheets: Sequence[Sheet]) -> list[Fault]:
    return [
        Fault(
            s.table,
            None,
            "",
            "no rows",
            "at least one row",
            f"the table is empty (a row is {TABLES[s.table].row}); fill it",
            s.file,
        )
        for s in sheets
        if TABLES[s.table].needed and not s.rows
    ]


def serials_are_written_as_text(cells: Iterable[tuple[str, str, int, str, str]]) -> list[Fault]:
    """``cells``: file, table, row, column and text of each serial that a workbook holds as a number."""
    message = "the serial is held as a number, so leading zeros may be lost; read as shown, make the cell text"
    return [Fault(table, row, column, text, "text", message, file) for file, table, row, column, text in cells]


SPACE_RULE = warns(cells_have_no_stray_spaces)
UNKNOWN_FILE_RULE = warns(files_are_known_tables)
MISSING_RULE = stops(needed_tables_are_there)
EMPTY_RULE = stops(needed_tables_hold_rows)
NUMBER_SERIAL_RULE = warns(serials_are_written_as_text)
TABLE_RULES: tuple[Rule, ...] = (UNKNOWN_FILE_RULE, MISSING_RULE, EMPTY_RULE, SPACE_RULE, NUMBER_SERIAL_RULE)


class Opened(NamedTuple):
    """A folder or workbook as text: its tables, what was wrong on opening, the bytes that were read by file name, and
    the tables that could not be read at all."""

    sheets: list[Sheet]
    found: list[Problem]
    contents: dict[str, bytes]
    unreadable: frozenset[str] = frozenset()


def read(path: Path) -> tuple[Records, tuple[Problem, ...]]:
    """Return the records of a folder or workbook, and what is wrong with their text.

    Raises RequestError where there is no such folder or workbook, or where it holds none of the tables.
    """
    opened = open_sheets(path)
    return read_sheets(
        opened.sheets,
        source=path.name,
        found=opened.found,
        contents=opened.contents,
        unreadable=opened.unreadable,
    )


def open_sheets(path: Path) -> Opened:
    """Return a folder's or workbook's tables as text; raises RequestError as ``read`` does."""
    if path.is_dir():
        return _open_folder(path)
    if path.is_file() and path.suffix.lower() in WORKBOOK_ENDINGS:
        return _open_workbook(path)
    found = "a file of another kind" if path.exists() else "nothing there"
    expected = "a folder of CSV tables or a workbook (.xlsx)"
    raise RequestError(f"fleet {path}", found, expected, "spoolwright demo FOLDER writes an example")


def _open_workbook(path: Path) -> Opened:
    from planner.workbook import read_workbook  # a folder is read without the workbook library

    book = read_workbook(path)
    if not book.sheets:
        raise RequestError(f"fleet {path}", "none of the tables", "sheets such as settings and aircraft")
    listing = Listing([*(sheet.table for sheet in book.sheets), *book.strangers], f"{path.name} sheet {{}}")
    found = problems(UNKNOWN_FILE_RULE, files_are_known_tables(listing))
    found += problems(MISSING_RULE, needed_tables_are_there(listing))
    found += problems(NUMBER_SERIAL_RULE, serials_are_written_as_text(book.number_serials))
    return Opened(book.sheets, found, {path.name: book.data})


def _open_folder(path: Path) -> Opened:
    try:
        files = sorted(f for f in path.iterdir() if f.is_file() and not f.name.startswith((".", "~")))
    except OSError as error:
        raise RequestError(f"fleet {path}", str(error), "a folder that may be read") from error
    tables = [f for f in files if f.suffix == ".csv" and f.stem in TABLES]
    if not tables:
        hint = (
            "name its subfolder" if any((d / "settings.csv").exists() for d in path.iterdir()) else "look at the path"
        )
        raise RequestError(f"fleet {path}", "none of the tables", "files such as settings.csv and aircraft.csv", hint)
    strangers = [f.name for f in files if f not in tables and f.suffix.lower() in _TABULAR]
    found = problems(UNKNOWN_FILE_RULE, files_are_known_tables(Listing(strangers, "{}")))
    listing = Listing([*(f.stem for f in tables), *strangers])
    found += problems(MISSING_RULE, needed_tables_are_there(listing))
    sheets: list[Sheet] = []
    unreadable: set[str] = set()
    contents: dict[str, bytes] = {}
    for file in tables:
        source = _source(file)
        contents[file.name] = source.data
        sheet, faults = _sheet(source)
        found += faults
        if sheet is None:
            unreadable.add(source.table)
        else:
            sheets.append(sheet)
    return Opened(sheets, found, contents, frozenset(unreadable))


def _source(file: Path) -> Source:
    try:
        size = file.stat().st_size
        return Source(file.stem, file.name, size, file.read_bytes() if size <= MOST_BYTES else b"")
    except OSError as error:
        raise RequestError(f"file {file}", str(error), "a file that may be read") from error


def _sheet(source: Source) -> tuple[Sheet | None, list[Problem]]:
    """Return a file's rows, or None where they cannot be told."""
    for rule in (SIZE_RULE, *BYTE_RULES):
        if faults := rule.check(source):
            return None, problems(rule, faults, file=source.file)
    found = [p for rule in FORM_RULES for p in problems(rule, rule.check(source), file=source.file)]
    try:
        return sheet_of(source), found
    except csv.Error:
        return None, found + problems(ROW_RULE, ROW_RULE.check(source), file=source.file)


def read_sheets(
    sheets: Sequence[Sheet],
    *,
    source: str = "",
    found: Sequence[Problem] = (),
    contents: dict[str, bytes] | None = None,
    unreadable: frozenset[str] = frozenset(),
) -> tuple[Records, tuple[Problem, ...]]:
    """Return typed records from tables of text, with the problems found so far and in their cells."""
    listed = list(found) + problems(EMPTY_RULE, needed_tables_hold_rows(sheets))
    tables = {name: empty_rows(name) for name in TABLES}
    for sheet in sheets:
        for rule in HEADING_RULES:
            listed += problems(rule, rule.check(sheet), file=sheet.file)
        tables[sheet.table], cells = typed(sheet)
        listed += cells
    known = tables["settings"].file and "settings" not in unreadable
    settings, faults = settings_in(tables["settings"], readable=bool(known))
    records = Records(
        source=source,
        tables=tables,
        settings=settings,
        fingerprint=fingerprint.files(contents) if contents is not None else "",
        unreadable=unreadable,
    )
    return records, tuple(listed + faults)


def typed(sheet: Sheet) -> tuple[Rows, list[Problem]]:
    """Return a sheet's columns as values, with a problem for each cell that does not say one."""
    headings = [heading.strip() for heading in sheet.headings]
    width = len(headings)
    ragged = {i for i, cells in enumerate(sheet.rows) if len(cells) != width}
    square = [(cells + [""] * width)[:width] if i in ragged else cells for i, cells in enumerate(sheet.rows)]
    by_heading = dict(zip(reversed(headings), reversed(list(zip(*square, strict=True))), strict=False))
    columns: dict[str, list[Any]] = {}
    faulty: set[tuple[int, str]] = set()
    found: list[Problem] = []
    for column in TABLES[sheet.table].columns:
        texts = by_heading.get(column.name)
        if texts is None:
            columns[column.name] = [None if column.required else default_of(column)] * len(sheet.rows)
            if column.required:
                faulty.update((number, column.name) for number in sheet.numbers)
            continue
        values, wrong = _values(column, texts)
        columns[column.name] = [values[text] for text in texts]
        if wrong:
            bad = [i for i, text in enumerate(texts) if text in wrong]
            faulty.update((sheet.numbers[i], column.name) for i in bad)
            told = [(sheet.numbers[i], texts[i]) for i in bad if i not in ragged]
            found += _cell_problems(sheet, column, told)
        spaced = {text for text in values if text != text.strip() and text.strip()}
        if spaced:
            rows = [(number, text) for number, text in zip(sheet.numbers, texts, strict=True) if text in spaced]
            found += problems(SPACE_RULE, cells_have_no_stray_spaces(sheet, column.name, rows))
    rows_read = Rows(
        table=TABLES[sheet.table],
        file=sheet.file,
        columns=columns,
        numbers=sheet.numbers,
        headings=tuple(headings),
        faulty=frozenset(faulty),
    )
    return rows_read, found


def _values(column: Column, texts: Sequence[str]) -> tuple[dict[str, Any], set[str]]:
    """Return the value of each distinct text, and the texts that say none."""
    values: dict[str, Any] = {}
    wrong: set[str] = set()
    for text in set(texts):
        try:
            values[text] = value_in(column, text.strip())
        except NotReadableError:
            values[text] = None
            wrong.add(text)
    return values, wrong


def _cell_problems(sheet: Sheet, column: Column, cells: Iterable[tuple[int, str]]) -> list[Problem]:
    """Return the problems of unreadable cells, gathered by the rule that each breaks."""
    by_rule: dict[str, tuple[Rule, list[Fault]]] = {}
    seen: dict[str, tuple[Rule, Wrong]] = {}
    for row, text in cells:
        if text not in seen:
            seen[text] = broken_rule(sheet.table, column, text.strip())
        rule, wrong = seen[text]
        fault = Fault(sheet.table, row, column.name, text, wrong.expected, wrong.message)
        by_rule.setdefault(rule.name, (rule, []))[1].append(fault)
    return [p for rule, faults in by_rule.values() for p in problems(rule, faults, file=sheet.file)]
