"""The same tables as one Excel workbook, a sheet a table: read within bounds, written so that every character returns.

Reading streams, caps rows and columns, and looks at the archive's own directory before anything is unpacked, so that a
bomb of a few kilobytes is refused at once. Writing keeps serials and whatever is not a plain number or date as text;
nothing is ever written as a formula.
"""

from __future__ import annotations

import datetime as dt
import io
import warnings
import zipfile
from collections.abc import Iterable, Iterator, Mapping
from pathlib import Path
from typing import Any, NamedTuple

import openpyxl
import xlsxwriter

from planner.cells import EARLIEST, NotReadableError, date_in
from planner.schema.column import Column, Table
from planner.schema.registry import TABLES
from planner.sheet import MOST_BYTES, MOST_COLUMNS, MOST_ROWS, Sheet
from sim.errors import RequestError

ABOUT = "about"
"""The sheet that explains the columns; it is not a table and is not read."""
_MOST_SHEET_BYTES = 400_000_000
_MOST_OTHER_BYTES = 64_000_000
_MOST_MEMBERS = 400
_MOST_CELL_CHARACTERS = 32_767
_CREATED = dt.datetime(2026, 1, 1)  # a fixed date makes the same tables the same bytes


class Book(NamedTuple):
    """What a workbook holds. ``number_serials``: file, table, row, column, text of serials held as numbers."""

    sheets: list[Sheet]
    strangers: list[str]
    number_serials: list[tuple[str, str, int, str, str]]
    data: bytes


def read_workbook(path: Path) -> Book:
    """Return the tables of a workbook as text. Raises RequestError where it is none, or is too large."""
    data = _safe_bytes(path)
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # what it says about styles and validations does not touch cells
            book = openpyxl.load_workbook(io.BytesIO(data), read_only=True, data_only=False, keep_links=False)
            return _tables_of(path, book, data)
    except RequestError:
        raise
    except Exception as error:  # a damaged workbook fails anywhere inside the library, with any error
        raise _refused(path, f"a workbook that cannot be read ({type(error).__name__})") from error


def _refused(path: Path, found: str) -> RequestError:
    return RequestError(f"workbook {path}", found, "an Excel workbook (.xlsx) with a sheet a table", "save it anew")


def _safe_bytes(path: Path) -> bytes:
    """Return the file's bytes once its archive promises to unpack within bounds."""
    try:
        size = path.stat().st_size
        if size > MOST_BYTES:
            raise _refused(path, f"{size / 1e6:,.0f} MB")
        data = path.read_bytes()
    except OSError as error:
        raise _refused(path, str(error)) from error
    try:
        with zipfile.ZipFile(io.BytesIO(data)) as archive:
            members = archive.infolist()
            sheets = sum(m.file_size for m in members if m.filename.startswith("xl/worksheets/"))
            others = sum(m.file_size for m in members) - sheets
            if len(members) > _MOST_MEMBERS or sheets > _MOST_SHEET_BYTES or others > _MOST_OTHER_BYTES:
                raise _refused(path, f"{(sheets + others) / 1e6:,.0f} MB when unpacked")
            for member in members:
                with archive.open(member) as stream:
                    head = stream.read(4096)
                if b"<!DOCTYPE" in head or b"<!ENTITY" in head or head[:2] in (b"\xff\xfe", b"\xfe\xff"):
                    raise _refused(path, f"declarations in {member.filename} that no table needs")
    except (zipfile.BadZipFile, NotImplementedError, RuntimeError, EOFError, OSError, ValueError) as error:
        raise _refused(path, "a file that is no workbook") from error
    return data


def _tables_of(path: Path, book: Any, data: bytes) -> Book:
    sheets: list[Sheet] = []
    strangers: list[str] = []
    numbers: list[tuple[str, str, int, str, str]] = []
    for name in book.sheetnames:
        if name not in TABLES:
            if name != ABOUT:
                strangers.append(name)
            continue
        file = f"{path.name} sheet {name}"
        book[name].reset_dimensions()  # what the file claims of its size is not believed
        sheet = _sheet(path, file, name, book[name].iter_rows(values_only=True))
        sheets.append(sheet[0])
        numbers += [(file, name, row, column, text) for row, column, text in sheet[1]]
    return Book(sheets, strangers, numbers, data)


def _sheet(
    path: Path, file: str, name: str, rows: Iterator[tuple[Any, ...]]
) -> tuple[Sheet, list[tuple[int, str, str]]]:
    """Return a sheet as text, and the row, column and text of serials that are held as numbers."""
    headings: tuple[str, ...] | None = None
    cells: list[list[str]] = []
    numbers: list[int] = []
    serials: list[tuple[int, str, str]] = []
    serial_at: list[int] = []
    for number, values in enumerate(rows, start=1):
        if number > MOST_ROWS + 1:
            raise _refused(path, f"more than {MOST_ROWS:,} rows in sheet {name}")
        if not values:
            continue
        if len(values) > MOST_COLUMNS:
            raise _refused(path, f"more than {MOST_COLUMNS} columns in sheet {name}")
        texts = [_text(value) for value in values]
        while texts and not texts[-1]:
            texts.pop()
        if not texts:
            continue
        if headings is None:
            headings = tuple(texts)
            kinds = {column.name for column in TABLES[name].columns if column.kind == "serial"}
            serial_at = [i for i, heading in enumerate(headings) if heading.strip() in kinds]
            continue
        texts += [""] * (len(headings) - len(texts))
        for i in serial_at:
            if isinstance(values[i] if i < len(values) else None, (int, float)):
                serials.append((number, headings[i], texts[i]))
        cells.append(texts)
        numbers.append(number)
    return Sheet(name, file, headings or (), cells, numbers), serials


def _text(value: Any) -> str:
    """Return a cell's value as a CSV cell would have it."""
    if value is None:
        return ""
    if isinstance(value, str):
        return value
    if isinstance(value, bool):
        return str(value).upper()
    if isinstance(value, float):
        return str(int(value)) if value.is_integer() and abs(value) < 1e15 else repr(value)
    if isinstance(value, dt.datetime) and value.time() == dt.time():
        return value.date().isoformat()
    if isinstance(value, (dt.date, dt.time)):
        return value.isoformat()
    return str(value)


def write_workbook(path: Path, sheets: Iterable[Sheet]) -> None:
    """Write tables as a workbook with headings, notes and drop-down lists; reading it gives the same text again.

    Raises RequestError where a cell is longer than a workbook can hold.
    """
    listed = list(sheets)
    options = {"strings_to_formulas": False, "strings_to_urls": False, "strings_to_numbers": False, "in_memory": True}
    with xlsxwriter.Workbook(str(path), options) as book:
        book.set_properties({"created": _CREATED})
        bold = book.add_format({"bold": True, "text_wrap": True, "valign": "top"})
        needed = book.add_format({"bold": True, "text_wrap": True, "valign": "top", "bottom": 2})
        day = book.add_format({"num_format": "yyyy-mm-dd"})
        text = book.add_format({"num_format": "@"})
        lengths = {sheet.table: len(sheet.rows) for sheet in listed}
        for sheet in listed:
            page = book.add_worksheet(sheet.table)
            page.freeze_panes(1, 0)
            for i, heading in enumerate(sheet.headings):
                column = _known(TABLES[sheet.table], heading)
                page.write_string(0, i, heading, needed if column is not None and column.required else bold)
                kind = None if column is None else column.kind
                page.set_column(i, i, max(12, len(heading) + 2), text if kind in ("serial", "text", "list") else None)
                if column is not None:
                    page.write_comment(0, i, about_column(column), {"x_scale": 2})
                    _drop_down(page, i, column, sheet.table, lengths)
            for r, cells in enumerate(sheet.rows, start=1):
                for i, cell in enumerate(cells):
                    if cell:
                        column = _known(TABLES[sheet.table], sheet.headings[i]) if i < len(sheet.headings) else None
                        _write(page, r, i, cell, column, day, text)
        _write_about(book, bold)


def _known(table: Table, heading: str) -> Column | None:
    return table.column(heading.strip()) if heading.strip() in table.names else None


def about_column(column: Column) -> str:
    """Return what a heading's note says: label, unit, meaning, whether it must be filled, allowed words."""
    lines = [column.heading + ": " + column.meaning]
    lines.append("must be filled" if column.required else f"may be blank{_default(column)}")
    if column.choices:
        lines.append("allowed: " + ", ".join(choice or "blank" for choice in column.choices))
    return "\n".join(lines)


def _default(column: Column) -> str:
    return "" if column.default in (None, "") else f" (then: {column.default})"


def _write(page: Any, r: int, i: int, cell: str, column: Column | None, day: Any, text: Any) -> None:
    """Write a cell as number or date only where reading it gives the very same text."""
    if len(cell) > _MOST_CELL_CHARACTERS:
        raise RequestError("workbook", f"a cell of {len(cell):,} characters", f"at most {_MOST_CELL_CHARACTERS:,}")
    kind = None if column is None else column.kind
    if kind in ("integer", "number"):
        try:
            value = float(cell)
        except ValueError:
            value = float("nan")
        # a workbook holds 16 digits: what needs more stays text
        if _text(float(f"{value:.16G}")) == cell and abs(value) < 1e15:
            page.write_number(r, i, value)
            return
    if kind == "date":
        try:
            date = date_in(cell)
        except NotReadableError:
            date = None
        if date is not None and date >= EARLIEST:
            page.write_datetime(r, i, dt.datetime(date.year, date.month, date.day), day)
            return
    page.write_string(r, i, cell, text)


def _drop_down(page: Any, i: int, column: Column, table: str, lengths: Mapping[str, int]) -> None:
    """Give a column a list to choose from: its allowed words, or the keys of the table that it refers to."""
    last = max(lengths[table] + 200, 500)
    words = [choice for choice in column.choices if choice]
    if words:
        page.data_validation(1, i, last, i, {"validate": "list", "source": words, "ignore_blank": True})
        return
    for here, there, names in TABLES[table].references:
        if here == (column.name,) and there in lengths and there != table and names[0] == TABLES[there].names[0]:
            source = f"={there}!$A$2:$A${max(lengths[there] + 1, 200)}"
            options = {"validate": "list", "source": source, "ignore_blank": True, "error_type": "warning"}
            page.data_validation(1, i, last, i, options)


def _write_about(book: Any, bold: Any) -> None:
    """Add the sheet that explains every column."""
    page = book.add_worksheet(ABOUT)
    page.freeze_panes(1, 0)
    heads = ("table", "column", "unit", "kind", "must be filled", "when blank", "meaning", "allowed words", "example")
    for i, head in enumerate(heads):
        page.write_string(0, i, head, bold)
        page.set_column(i, i, 60 if head == "meaning" else 18)
    r = 1
    for table in TABLES.values():
        for column in table.columns:
            choices = ", ".join(choice or "blank" for choice in column.choices)
            default = "" if column.default is None else str(column.default)
            filled = "yes" if column.required else "no"
            for i, value in enumerate(
                (
                    table.name,
                    column.name,
                    column.unit,
                    column.kind,
                    filled,
                    default,
                    column.meaning,
                    choices,
                    column.example,
                )
            ):
                page.write_string(r, i, value)
            r += 1
