"""A workbook holds the same tables as a folder, to the last character, and a hostile one is refused in seconds."""

from __future__ import annotations

import io
import time
import zipfile
from pathlib import Path

import openpyxl
import pytest
import small_tables
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from planner import cli, template
from planner.assemble import load
from planner.checks.rules import check
from planner.sheet import Sheet
from planner.tables import open_sheets, read
from planner.workbook import read_workbook, write_workbook
from sim.errors import RequestError


def same(first: list[Sheet], second: list[Sheet]) -> bool:
    """Return whether tables have the same text; a table without rows keeps its headings."""
    one = {sheet.table: (sheet.headings, sheet.rows) for sheet in first}
    return one == {sheet.table: (sheet.headings, sheet.rows) for sheet in second}


def test_folder_to_workbook_and_back_is_the_same_fleet(tmp_path: Path) -> None:
    tables = small_tables.small_tables()
    tables["parts"][0]["owner"] = "0012345678901234567890"
    tables["aircraft"][0]["owner"] = "1e5"
    tables["aircraft"][1]["owner"] = "2026-07-01"
    tables["ratings"][0]["thrust_kN"] = "108.50"
    folder = small_tables.write(tmp_path / "fleet", tables)
    template.write(tmp_path / "fleet.xlsx", folder)
    template.write(tmp_path / "again", tmp_path / "fleet.xlsx")
    assert same(open_sheets(folder).sheets, open_sheets(tmp_path / "fleet.xlsx").sheets)
    for file in folder.iterdir():
        assert (tmp_path / "again" / file.name).read_text() == file.read_text()
    assert load(tmp_path / "fleet.xlsx") == load(folder)
    _, found = check(tmp_path / "fleet.xlsx")
    assert {p.rule for p in found} == {p.rule for p in check(folder)[1]}


def test_the_same_tables_make_the_same_bytes(tmp_path: Path) -> None:
    sheets = small_tables.sheets(small_tables.small_tables())
    for name in ("a.xlsx", "b.xlsx"):
        write_workbook(tmp_path / name, sheets)
    assert (tmp_path / "a.xlsx").read_bytes() == (tmp_path / "b.xlsx").read_bytes()


cells = st.text(st.characters(min_codepoint=32, max_codepoint=0x2FFF, exclude_categories=("Cs", "Cc")), max_size=30)
numbers = st.one_of(
    st.integers().map(str), st.floats(allow_nan=False).map(repr), st.sampled_from(["007", "1.0", "1,5"])
)
dates = st.one_of(st.dates().map(str), st.sampled_from(["2026-7-1", "1899-12-31", "today"]))


@settings(max_examples=12, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(st.lists(st.tuples(cells, cells, numbers, dates), min_size=1, max_size=8))
def test_any_text_comes_back_to_the_last_character(tmp_path: Path, rows: list[tuple[str, str, str, str]]) -> None:
    headings = ("part_serial", "owner", "cycles_since_new", "made_date")
    kept = [list(row) for row in rows if any(row)]
    sheet = Sheet("parts", "parts.csv", headings, kept, list(range(2, len(kept) + 2)))
    path = tmp_path / "any.xlsx"
    write_workbook(path, [sheet])
    assert read_workbook(path).sheets[0].rows == kept


def test_what_begins_like_a_formula_is_written_as_text(tmp_path: Path) -> None:
    rows = [["=1+1", "+A1", "@x", "-2"]]
    headings = ("part_serial", "part_number", "owner", "module_serial")
    write_workbook(tmp_path / "f.xlsx", [Sheet("parts", "", headings, rows, [2])])
    page = openpyxl.load_workbook(tmp_path / "f.xlsx")["parts"]
    assert [cell.data_type for cell in page[2]] == ["s"] * 4
    assert read_workbook(tmp_path / "f.xlsx").sheets[0].rows == rows


def test_serials_held_as_numbers_are_told_with_their_cell(tmp_path: Path) -> None:
    template.write(tmp_path / "fleet.xlsx", small_tables.write(tmp_path / "fleet", small_tables.small_tables()))
    book = openpyxl.load_workbook(tmp_path / "fleet.xlsx")
    page = book["installs"] if "installs" in book.sheetnames else book.create_sheet("installs")
    for row in (["serial", "parent_serial", "on_date", "off_date"], [123, "E1", "2019-01-01", "2020-01-01"]):
        page.append(row)
    book.create_sheet("partz")
    book.save(tmp_path / "mine.xlsx")
    _, found = check(tmp_path / "mine.xlsx")
    told = [(p.rule, p.file, p.row, p.column) for p in found]
    assert told == [
        ("serials_are_written_as_text", "mine.xlsx sheet installs", 2, "serial"),
        ("files_are_known_tables", "mine.xlsx sheet partz", None, ""),
    ]


def test_the_blank_workbook_explains_every_column_and_is_itself_readable(tmp_path: Path) -> None:
    assert template.write(tmp_path / "blank.xlsx") == template.write(tmp_path / "blank")
    book = openpyxl.load_workbook(tmp_path / "blank.xlsx")
    heading = book["engines"]["C1"]
    assert heading.value == "place"
    assert "allowed: wing, spare, shop, leased_in" in heading.comment.text
    lists = [v.formula1 for v in book["engines"].data_validations.dataValidation]
    assert '"wing,spare,shop,leased_in"' in lists
    assert "=engine_types!$A$2:$A$200" in lists or "engine_types!$A$2:$A$200" in lists
    about = {(row[0], row[1]) for row in book["about"].iter_rows(min_row=2, values_only=True)}
    assert ("parts", "cycles_since_new") in about
    assert same(open_sheets(tmp_path / "blank").sheets, open_sheets(tmp_path / "blank.xlsx").sheets)
    for form in ("blank", "blank.xlsx"):
        records, found = read(tmp_path / form)
        assert [p for p in found if p.severity == "stops" and p.table != "settings"] == []
        assert len(records["parts"]) == 1
    assert (tmp_path / "blank" / "TABLES.md").read_text().startswith("# The tables")


@pytest.mark.parametrize("name", ["taken", "taken.csv", "file.xlsx"])
def test_nothing_is_overwritten(tmp_path: Path, name: str) -> None:
    (tmp_path / "taken").mkdir()
    (tmp_path / "taken" / "x").write_text("mine")
    (tmp_path / "file.xlsx").write_text("mine")
    with pytest.raises(RequestError, match="target"):
        template.write(tmp_path / name)
    assert not list(tmp_path.glob(".*part"))


def test_the_command_writes_either_form(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    for target in ("one", "two.xlsx"):
        with pytest.raises(SystemExit) as ended:
            cli.main(["template", str(tmp_path / target)])
        assert ended.value.code == 0
    assert "tables are in" in capsys.readouterr().out


# hostile files -------------------------------------------------------------------------------------------------------


def archive(members: dict[str, bytes]) -> bytes:
    stream = io.BytesIO()
    with zipfile.ZipFile(stream, "w", zipfile.ZIP_DEFLATED) as bundle:
        for name, data in members.items():
            bundle.writestr(name, data)
    return stream.getvalue()


def sound_members(tmp_path: Path) -> dict[str, bytes]:
    write_workbook(tmp_path / "sound.xlsx", small_tables.sheets(small_tables.small_tables()))
    with zipfile.ZipFile(tmp_path / "sound.xlsx") as bundle:
        return {name: bundle.read(name) for name in bundle.namelist()}


def refused(path: Path, match: str) -> None:
    began = time.perf_counter()
    with pytest.raises(RequestError, match=match):
        read(path)
    assert time.perf_counter() - began < 5


def test_a_bomb_is_refused_before_it_is_unpacked(tmp_path: Path) -> None:
    members = sound_members(tmp_path) | {"xl/sharedStrings.xml": b"<sst>" + b"a" * 90_000_000}
    path = tmp_path / "bomb.xlsx"
    path.write_bytes(archive(members))
    assert path.stat().st_size < 400_000
    refused(path, "when unpacked")


def test_entities_are_refused(tmp_path: Path) -> None:
    laugh = b'<?xml version="1.0"?><!DOCTYPE x [<!ENTITY a "ha"><!ENTITY b "&a;&a;">]><sst>&b;</sst>'
    path = tmp_path / "laugh.xlsx"
    path.write_bytes(archive(sound_members(tmp_path) | {"xl/sharedStrings.xml": laugh}))
    refused(path, "declarations")


def test_a_sheet_that_claims_the_last_row_is_read_within_bounds(tmp_path: Path) -> None:
    book = openpyxl.Workbook()
    page = book.active
    page.title = "bases"
    page["A1"], page["B1"], page["A1048576"] = "base", "environment", "Home"
    book.save(tmp_path / "far.xlsx")
    refused(tmp_path / "far.xlsx", "rows")
    page["XFD2"] = "far"
    book.save(tmp_path / "wide.xlsx")
    refused(tmp_path / "wide.xlsx", "columns")


@pytest.mark.parametrize(
    "data", [b"", b"PK\x03\x04", b"not a workbook", archive({"a.txt": b"x"})], ids=["empty", "cut", "text", "zip"]
)
def test_what_is_no_workbook_is_refused(tmp_path: Path, data: bytes) -> None:
    path = tmp_path / "x.xlsx"
    path.write_bytes(data)
    refused(path, "workbook")


def test_a_file_of_100_mb_is_refused_unread(tmp_path: Path) -> None:
    path = tmp_path / "large.xlsx"
    with path.open("wb") as file:
        file.truncate(100_000_000)
    refused(path, "100 MB")
