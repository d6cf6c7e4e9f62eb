"""Whatever is done to the tables, reading and checking ends with problems told, never with a traceback, and what is
read without a problem that stops is a fleet."""

from __future__ import annotations

import random
import string
from pathlib import Path

import pytest
import small_tables
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from planner.assemble import assemble, load
from planner.checks.rules import check, record_problems
from planner.life import lives
from planner.records import Records
from planner.sheet import Sheet
from planner.tables import read_sheets
from sim.errors import Problem, UserError
from sim.life import cycles_left

ROOT = Path(__file__).resolve().parents[3]
NASTY = (
    "",
    " ",
    "0",
    "-1",
    "1e99",
    "nan",
    "inf",
    "1,5",
    "12 000",
    "=1+1",
    "+5",
    "@x",
    "yes",
    "N",
    "T-1",
    "E1",
    "high",
    "2026-07-01",
    "2026-13-40",
    "01/02/2020",
    "9999-12-31",
    "0001-01-01",
    "999999999999",
    "\u0660\u0661",
    "\u202e",
    "O" * 500,
    "a\nb",
    "8000.0",
    "shop",
)


def answer(sheets: list[Sheet]) -> tuple[Records, list[Problem]]:
    records, found = read_sheets(sheets)
    return records, [*found, *record_problems(records)]


def held_to_account(sheets: list[Sheet]) -> None:
    """Check a mutant; where nothing stops, its fleet and its lives must come out sound."""
    records, found = answer(sheets)
    for problem in found:
        assert problem.severity in ("stops", "warns")
        assert problem.message
        assert problem.sentence().isprintable() or "\n" not in problem.found
    if any(problem.severity == "stops" for problem in found):
        return
    fleet = assemble(records)
    rules = {row.part_number: row.counting_rule for row in fleet.part_types}
    for row in lives(fleet).parts:
        assert 0 <= row.cycles_left <= max(row.limit_cycles, 0)
        assert row.life_known or row.cycles_left == 0
    for part in fleet.parts:
        rows = tuple(r for r in fleet.part_limits if r.part_number == part.part_number)
        assert part.life_known or not cycles_left(
            part.flown, "high", rows, rule=rules[part.part_number], day=0.0, known=part.life_known
        )


def mutate(tables: small_tables.Tables, luck: random.Random) -> None:
    """Do one thing to a table: a cell, a row, a heading, a swap."""
    name = luck.choice([name for name, rows in tables.items() if rows])
    rows = tables[name]
    row = luck.choice(rows)
    kind = luck.random()
    column = luck.choice(list(row))
    if kind < 0.55:
        row[column] = luck.choice(NASTY)
    elif kind < 0.65:
        cell = row[column]
        at = luck.randrange(len(cell) + 1)
        row[column] = cell[:at] + luck.choice(string.printable[:95]) + cell[at + 1 :]
    elif kind < 0.75:
        rows.remove(row)
    elif kind < 0.85:
        rows.append(dict(row))
    elif kind < 0.93:
        other = luck.choice(rows)
        row[column], other[column] = other[column], row[column]
    else:
        new = luck.choice([column + " ", column.upper(), column[:-1], ""])
        tables[name] = [{(new if key == column else key): value for key, value in one.items()} for one in rows]


def run_mutations(count: int, seed: int) -> None:
    luck = random.Random(seed)
    for _ in range(count):
        tables = small_tables.small_tables()
        for _ in range(luck.choice((1, 1, 2, 5))):
            mutate(tables, luck)
        held_to_account(small_tables.sheets(tables))


def test_two_hundred_random_mutations_are_told_or_harmless() -> None:
    run_mutations(200, seed=1)


@pytest.mark.long
def test_ten_thousand_random_mutations_of_the_demo_kind_are_told_or_harmless() -> None:
    run_mutations(10_000, seed=2)


def test_every_heading_may_be_missing_and_every_column_blank_or_noise() -> None:
    for name, rows in small_tables.small_tables().items():
        for column in rows[0]:
            for cell in (None, "", "#", "-3", "2999-01-01"):
                tables = small_tables.small_tables()
                for row in tables[name]:
                    row[column] = cell or ""
                    if cell is None:
                        del row[column]
                held_to_account(small_tables.sheets(tables))


@pytest.mark.parametrize("count", [40, pytest.param(1_500, marks=pytest.mark.long)])
def test_files_that_are_cut_or_spoiled_never_give_a_traceback(tmp_path: Path, count: int) -> None:
    luck = random.Random(3)
    folder = small_tables.write(tmp_path / "fleet", small_tables.small_tables())
    files = sorted(folder.iterdir())
    sound = {file: file.read_bytes() for file in files}
    for _ in range(count):
        file = luck.choice(files)
        data = bytearray(sound[file])
        if luck.random() < 0.5:
            del data[luck.randrange(len(data)) :]
        else:
            for _ in range(luck.choice((1, 3, 40))):
                data[luck.randrange(len(data))] = luck.randrange(256)
        file.write_bytes(bytes(data))
        try:
            fleet = load(folder)
        except UserError:
            pass  # told: what the message says is tested rule by rule
        else:
            assert all(row.cycles_left >= 0 for row in lives(fleet).parts)
        file.write_bytes(sound[file])


@settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(st.binary(max_size=400), st.sampled_from(["parts", "settings", "aircraft", "season", "part_limits"]))
def test_random_bytes_never_give_a_traceback(tmp_path: Path, data: bytes, name: str) -> None:
    folder = tmp_path / "fleet"
    if not folder.exists():
        small_tables.write(folder, small_tables.small_tables())
    file = folder / f"{name}.csv"
    sound = file.read_bytes()
    file.write_bytes(data)
    _, found = check(folder)
    file.write_bytes(sound)
    assert any(problem.severity == "stops" for problem in found)


@settings(max_examples=150, deadline=None)
@given(
    st.sampled_from(["parts", "engines", "modules", "aircraft", "part_limits", "part_history"]),
    st.integers(0, 1_000),
    st.integers(0, 1_000),
    st.text(max_size=12),
)
def test_any_text_in_any_cell_is_told_or_read_as_it_stands(table: str, row: int, column: int, text: str) -> None:
    tables = small_tables.small_tables()
    rows = tables[table]
    name = list(rows[0])[column % len(rows[0])]
    number = row % len(rows)
    rows[number][name] = text
    records, found = answer(small_tables.sheets(tables))
    told = [p for p in found if (p.table, p.row, p.column) == (table, number + 2, name)]
    value = records[table][name][number]
    if value is None and text.strip():
        assert told, f"{text!r} in {table}.{name} was dropped without a word"
    if isinstance(value, str) and value:
        assert value == text.strip()


@pytest.mark.long
def test_ten_thousand_mutations_of_the_demo_tables_are_told_or_harmless() -> None:
    """The demo itself, a cell at a time: reading it whole each time takes too long, so the tables are typed alone."""
    from planner.tables import open_sheets, typed

    luck = random.Random(4)
    sheets = {sheet.table: sheet for sheet in open_sheets(ROOT / "demo_fleet").sheets}
    names = sorted(sheets)
    for _ in range(10_000):
        sheet = sheets[luck.choice(names)]
        i = luck.randrange(len(sheet.rows))
        row = list(sheet.rows[i])
        j = luck.randrange(len(row))
        row[j] = luck.choice(NASTY)
        few = sheet._replace(rows=[row], numbers=[sheet.numbers[i]])
        rows, found = typed(few)
        column = rows.headings[j]
        value = rows[column][0]
        assert value is not None or not row[j].strip() or any(p.column == column for p in found)
