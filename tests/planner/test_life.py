"""The question ``life`` on small records worked by hand."""

from __future__ import annotations

import datetime as dt
import json
import math
from pathlib import Path

import pytest
import small_tables

from planner import cli
from planner.assemble import assemble
from planner.directives import DirectiveLife
from planner.life import EngineLife, Lives, PartLife, lives
from planner.schema.registry import OUTPUTS
from planner.tables import read_sheets
from planner.whose import Elsewhere
from sim.errors import RequestError

AS_OF = dt.date(2026, 7, 1)


def lives_of(tables: small_tables.Tables, **asked: object) -> Lives:
    records, found = read_sheets(small_tables.sheets(tables))
    assert [p for p in found if p.severity == "stops"] == []
    return lives(assemble(records), **asked)  # type: ignore[arg-type]


def part(answer: Lives, serial: str) -> PartLife:
    return next(row for row in answer.parts if row.part_serial == serial)


def column(tables: small_tables.Tables, table: str, **cells: str) -> None:
    """Add columns that are blank but for the last row's cells."""
    for row in tables[table]:
        for name in cells:
            row.setdefault(name, "")
    tables[table][-1].update(cells)


def two_ratings(tables: small_tables.Tables, serial: str) -> None:
    """Let a part have flown 6,000 cycles at high and 4,000 at low, as in TRADE.md."""
    stretches = [row for row in tables["part_history"] if row["part_serial"] == serial]
    stretches[0] |= {"rating": "high", "cycles": "6000", "hours": "12000"}
    stretches[1] |= {"rating": "low", "cycles": "4000", "hours": "8000"}
    next(row for row in tables["parts"] if row["part_serial"] == serial)["cycles_since_new"] = "10000"


@pytest.mark.parametrize(
    ("serial", "rule", "left", "tail"),
    [("H101", "linear", 5_756, "T-1"), ("H103", "linear", 7_100, "T-2"), ("H103", "most_restrictive", 5_000, "T-2")],
)
def test_the_worked_case_of_two_ratings_through_the_tables(serial: str, rule: str, left: int, tail: str) -> None:
    tables = small_tables.small_tables()
    two_ratings(tables, serial)
    tables["part_types"][1]["counting_rule"] = rule
    row = part(lives_of(tables), serial)
    assert (row.cycles_left, row.tail, row.cycles_by_rating) == (left, tail, "high 6000, low 4000")
    assert row.used_frac == pytest.approx(10_000 / 15_000 if rule != "linear" else 6 / 15 + 4 / 18.5)


def test_date_and_value_at_planned_use() -> None:
    row = part(lives_of(small_tables.small_tables()), "H101")
    assert (row.limit_cycles, row.cycles_left, row.state, row.limit_source) == (15_000, 7_000, "clear", "Manual rev 12")
    assert row.date_reached == AS_OF + dt.timedelta(days=math.floor(7_000 / 1_900 * 365.25))
    assert row.value_left_usd == pytest.approx(310_000 * 7_000 / 15_000)


def test_the_season_moves_the_date() -> None:
    tables = small_tables.small_tables()
    for month in tables["season"]:
        month["share"] = "1.5" if int(month["month"]) in (7, 8, 9) else "0.8333333"
    tables["part_limits"][2]["limit_cycles"] = "8300"
    even = AS_OF + dt.timedelta(days=math.floor(300 / 1_900 * 365.25))
    summer = part(lives_of(tables), "H101").date_reached
    assert summer is not None
    assert AS_OF + dt.timedelta(days=math.floor(300 / 1_900 * 365.25 / 1.5)) <= summer < even


def test_off_a_tail_the_least_rating_is_named_and_no_date_given() -> None:
    row = part(lives_of(small_tables.small_tables()), "H105")
    assert (row.rating, row.cycles_left, row.tail, row.date_reached) == ("high", 7_000, "", None)


def test_states_in_words() -> None:
    tables = small_tables.small_tables()
    tables["parts"][0]["status_substantiated"] = "no"  # F101
    tables["part_limits"][2]["limit_cycles"] = "8000"  # HPT-D1 at high
    tables["part_limits"][3]["limit_cycles"] = "8499"  # HPT-D1 at low
    answer = lives_of(tables)
    assert [part(answer, serial).state for serial in ("F101", "H101", "H103", "F103")] == [
        "unknown",
        "at limit",
        "near limit",
        "clear",
    ]
    unknown = part(answer, "F101")
    assert (unknown.cycles_left, unknown.life_known, unknown.used_frac, unknown.value_left_usd) == (0, False, 1.0, 0.0)
    assert part(answer, "H101").date_reached == AS_OF


def test_an_engine_shows_the_part_that_limits_and_the_next() -> None:
    answer = lives_of(small_tables.small_tables())
    weakest = answer.engines[0]
    assert (weakest.engine_serial, weakest.cycles_left, weakest.limiting_part_serial) == ("E1", 7_000, "H101")
    assert (weakest.second_part_serial, weakest.second_cycles_left) == ("F101", 12_000)
    assert (weakest.third_part_serial, weakest.third_cycles_left) == ("", None)


def test_hour_and_calendar_limits_bite_too() -> None:
    tables = small_tables.small_tables()
    for row in tables["part_limits"]:
        row |= {"limit_hours": "", "limit_days": ""}
    tables["part_limits"][2]["limit_hours"] = "17000"
    tables["part_limits"][3]["limit_days"] = "3500"
    answer = lives_of(tables)
    by_hours, by_days = part(answer, "H101"), part(answer, "H103")
    # 1,000 hours at 3,100 a year
    assert (by_hours.hours_left, by_hours.cycles_left) == (1_000, 7_000)
    assert by_hours.date_reached == AS_OF + dt.timedelta(days=math.floor(1_000 / 3_100 * 365.25))
    assert by_hours.value_left_usd == pytest.approx(310_000 * 1_000 / 17_000)
    made = dt.date(2017, 3, 1)
    assert by_days.date_reached == made + dt.timedelta(days=3_500)
    assert by_days.days_left == 3_500 - (AS_OF - made).days


def test_a_later_day_counts_what_is_flown_until_then() -> None:
    answer = lives_of(small_tables.small_tables(), at=dt.date(2027, 7, 1))
    flown = math.floor(1_900 * 365 / 365.25)
    row = part(answer, "H101")
    assert (row.cycles_used, row.cycles_left) == (8_000 + flown, 7_000 - flown)
    assert row.date_reached == part(lives_of(small_tables.small_tables()), "H101").date_reached
    assert part(answer, "H105").cycles_left == 7_000
    with pytest.raises(RequestError, match="or later"):
        lives_of(small_tables.small_tables(), at=dt.date(2026, 6, 30))


def test_a_rating_that_expires_changes_the_count_from_that_day() -> None:
    tables = small_tables.small_tables()
    tables["aircraft"][1] |= {"rating_until": "", "rating_after": ""}
    tables["aircraft"][0] |= {"rating_until": "2027-07-01", "rating_after": "low"}
    row = part(lives_of(tables), "H101")
    assert row.cycles_left == 7_000  # at the rating of today
    flown = math.floor(1_900 * 365 / 365.25)
    low = math.floor((1 - (8_000 + flown) / 15_000) * 18_500)
    expected = AS_OF + dt.timedelta(days=math.floor((flown + low) / 1_900 * 365.25))
    assert row.date_reached is not None
    assert abs((row.date_reached - expected).days) <= 1


def test_a_directive_says_who_when_and_how_much() -> None:
    tables = small_tables.small_tables()
    cut = {"part_number": "HPT-D1", "rating": "high", "limit_cycles": "9000", "source": "D-1"}
    tables["part_limits"].append(cut)
    directive = {"valid_from": "2026-11-15", "serial_prefix": "H", "serial_from": "101", "serial_to": "104"}
    column(tables, "part_limits", directive="D-1", **directive)
    answer = lives_of(tables)
    assert [row.part_serial for row in answer.directives] == ["H101", "H102", "H103", "H104"]
    hit = answer.directives[0]
    assert (hit.limit_before_cycles, hit.limit_after_cycles) == (15_000, 9_000)
    assert (hit.cycles_left_before, hit.cycles_left_after, hit.over_on_day_one) == (7_000, 1_000, False)
    assert hit.date_reached == AS_OF + dt.timedelta(days=math.floor(1_000 / 1_900 * 365.25))
    assert hit.value_lost_usd == pytest.approx(310_000 * (7_000 / 15_000 - 1_000 / 9_000))
    # flown at low only: a cut at high takes nothing from it there
    assert answer.directives[2].value_lost_usd == 0.0
    tables["part_limits"][-1]["limit_cycles"] = "8300"
    over = lives_of(tables).directives[0]
    assert (over.over_on_day_one, over.date_reached) == (True, dt.date(2026, 11, 15))


def test_whose_serials_are_in_whose_assemblies_and_when_they_go_back() -> None:
    tables = small_tables.small_tables()
    tables["modules"][0]["owner"] = "Lessor A"
    tables["parts"][0]["owner"] = "Lessor A"
    tables["parts"][1]["owner"] = ""
    tables["leases"] = [
        {"lease": "L", "tail": "T-2", "owner": "Lessor A", "return_date": "2028-01-01", "terms": "A"},
    ]
    found = lives_of(tables).places
    assert [(row.serial, row.owner, row.flies_on, row.flies_on_owner, row.due_back) for row in found] == [
        ("fan-01", "Lessor A", "E1", "Own", dt.date(2028, 1, 1)),
        ("H101", "the operator", "HPT-01", "Own", None),
    ]


def test_an_aircraft_still_to_come_flies_from_its_entry() -> None:
    tables = small_tables.small_tables()
    tables["aircraft"][0]["entry_date"] = ""
    tables["aircraft"][1]["entry_date"] = "2028-01-01"
    entry = (dt.date(2028, 1, 1) - AS_OF).days
    row = part(lives_of(tables), "H103")
    expected = AS_OF + dt.timedelta(days=math.floor(entry + 10_500 / 1_900 * 365.25))
    assert row.date_reached is not None
    assert abs((row.date_reached - expected).days) <= 1


@pytest.mark.parametrize("asked", [{"tail": "T-9"}, {"engine": "E9"}])
def test_unknown_serials_are_refused(asked: dict[str, str]) -> None:
    with pytest.raises(RequestError, match="of the fleet"):
        lives_of(small_tables.small_tables(), **asked)


def run(capsys: pytest.CaptureFixture[str], *arguments: str) -> tuple[int, str, str]:
    with pytest.raises(SystemExit) as ended:
        cli.main([*arguments])
    captured = capsys.readouterr()
    return int(ended.value.code or 0), captured.out, captured.err


def test_the_command_prints_a_table_and_the_object(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    folder = str(small_tables.write(tmp_path / "fleet", small_tables.small_tables()))
    code, out, err = run(capsys, "life", folder, "--tail", "T-1")
    assert (code, err) == (0, "")
    assert "Engines, weakest first" in out
    assert "At a limit the answer is stop" in out
    assert "E3" not in out
    body = json.loads(run(capsys, "life", folder, "--engine", "E3", "--json")[1])["result"]
    assert {row["part_serial"] for row in body["parts"]} == {"F103", "H103"}
    names = "part_serial part_number module_serial engine_serial tail rating limit_cycles limit_source cycles_used"
    names += " used_frac cycles_left life_known date_reached value_left_usd"
    assert set(names.split()) <= set(body["parts"][0])
    assert body["engines"][0]["limiting_part_serial"] == "H103"
    assert "No directive" in run(capsys, "life", folder, "--directives")[1]


def test_faults_end_with_their_codes(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    tables = small_tables.small_tables()
    tables["parts"][0]["cycles_since_new"] = "x"
    folder = str(small_tables.write(tmp_path / "fleet", tables))
    code, out, err = run(capsys, "life", folder)
    assert (code, out) == (1, "")
    assert "1 problem in the records" in err
    assert run(capsys, "life", folder, "--at", "tomorrow")[0] == 2


def test_rows_have_the_columns_of_the_output_tables() -> None:
    assert set(PartLife._fields) == set(OUTPUTS["life_parts"].names)
    assert set(EngineLife._fields) == set(OUTPUTS["life_engines"].names)
    assert set(DirectiveLife._fields) == set(OUTPUTS["life_directives"].names)
    assert set(Elsewhere._fields) == set(OUTPUTS["life_places"].names)
