"""The command ``check``: its text, its JSON object and exit codes, and what moved between two versions."""

from __future__ import annotations

import json
from pathlib import Path

import pytest
import small_tables

from planner import cli
from planner.changes import changes
from planner.tables import read_sheets


def run(capsys: pytest.CaptureFixture[str], *arguments: str) -> tuple[int, str, str]:
    with pytest.raises(SystemExit) as ended:
        cli.main([*arguments])
    captured = capsys.readouterr()
    return int(ended.value.code or 0), captured.out, captured.err


def test_a_sound_fleet_ends_with_code_0(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    folder = small_tables.write(tmp_path / "fleet", small_tables.small_tables())
    code, out, err = run(capsys, "check", str(folder))
    assert (code, err) == (0, "")
    assert "No problem found." in out
    assert "Assumed: leases.csv is missing: no aircraft or engine goes back to a lessor" in out
    assert "Planning aid only" in out


def test_problems_that_stop_end_with_code_1_and_the_object_is_printed(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    tables = small_tables.small_tables()
    tables["parts"][5]["cycles_since_new"] = "21400"
    tables["part_history"][10]["cycles"] = "16900"
    folder = small_tables.write(tmp_path / "fleet", tables)
    code, out, _ = run(capsys, "check", str(folder), "--json")
    body = json.loads(out)
    assert code == 1
    assert (body["command"], len(body["inputs"])) == ("check", 64)
    problem = next(p for p in body["result"]["problems"] if p["rule"] == "used_life_is_within_limit")
    assert (problem["file"], problem["table"], problem["row"]) == ("parts.csv", "parts", 7)
    assert (problem["column"], problem["severity"]) == ("cycles_since_new", "stops")
    assert "21,400 is past the limit 18,500 of HPT-D1 at rating low" in problem["message"]
    assert run(capsys, "check", str(folder))[0] == 1


def test_warnings_alone_end_with_code_0(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    tables = small_tables.small_tables()
    tables["parts"][0]["status_substantiated"] = "no"
    code, out, _ = run(capsys, "check", str(small_tables.write(tmp_path / "fleet", tables)))
    assert code == 0
    assert "parts.csv row 2, column cycles_since_new: F101: status is not substantiated; its life counts as zero" in out


@pytest.mark.parametrize("name", ["nowhere", "empty"])
def test_no_fleet_is_one_line_on_standard_error(tmp_path: Path, capsys: pytest.CaptureFixture[str], name: str) -> None:
    (tmp_path / "empty").mkdir()
    code, out, err = run(capsys, "check", str(tmp_path / name))
    assert (code, out) == (1, "")
    assert err.startswith("spoolwright: fleet ")
    assert "Traceback" not in err


def test_wrong_usage_ends_with_code_2(capsys: pytest.CaptureFixture[str]) -> None:
    assert run(capsys, "check")[0] == 2
    assert run(capsys, "check", "x", "--no-such-option")[0] == 2


def test_what_moved_is_told_by_kind() -> None:
    old, new = small_tables.small_tables(), small_tables.small_tables()
    new["settings"][0]["value"] = "2026-07-08"
    new["engines"][0]["cycles_since_new"] = "8036"
    new["engines"][1]["cycles_since_new"] = "7990"
    new["modules"][1] |= {"engine_serial": "E5"}
    new["modules"][3] |= {"cycles_since_restoration": "0"}
    new["part_limits"][0]["limit_cycles"] = "19000"
    new["part_types"][0]["price_usd"] = "210000"
    new["parts"][0]["made_date"] = "2017-03-02"
    del new["part_history"][0]
    new["part_history"].append(old["part_history"][0] | {"from_date": "2026-07-02", "to_date": "", "cycles": "36"})
    new["strategies"].append({"strategy": "late", "way_out": "exchange"})
    found = changes(*(read_sheets(small_tables.sheets(tables))[0] for tables in (old, new)))
    assert {(c.table, c.key, c.what, c.column, c.before, c.after) for c in found if c.column} == {
        ("settings", "as_of", "other", "value", "2026-07-01", "2026-07-08"),
        ("engines", "E1", "use", "cycles_since_new", "8000", "8036"),
        ("engines", "E2", "correction", "cycles_since_new", "8000", "7990"),
        ("modules", "HPT-01", "swap", "engine_serial", "E1", "E5"),
        ("modules", "HPT-02", "visit", "cycles_since_restoration", "3000", "0"),
        ("part_limits", "FAN-D1 high", "limit", "limit_cycles", "20000", "19000"),
        ("part_types", "FAN-D1", "price", "price_usd", "200000", "210000"),
        ("parts", "F101", "correction", "made_date", "2017-03-01", "2017-03-02"),
    }
    rows = {(c.table, c.what) for c in found if not c.column}
    assert rows == {("part_history", "use"), ("part_history", "correction"), ("strategies", "new")}


def test_a_count_that_grows_on_one_date_is_a_correction() -> None:
    old, new = small_tables.small_tables(), small_tables.small_tables()
    new["parts"][0]["cycles_since_new"] = "8100"
    del new["modules"][0]
    found = changes(*(read_sheets(small_tables.sheets(tables))[0] for tables in (old, new)))
    assert [(c.table, c.key, c.what) for c in found] == [("modules", "fan-01", "gone"), ("parts", "F101", "correction")]


def test_against_prints_what_moved(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    old = small_tables.write(tmp_path / "old", small_tables.small_tables())
    tables = small_tables.small_tables()
    tables["engines"][4]["base"] = ""
    new = small_tables.write(tmp_path / "new", tables)
    code, out, _ = run(capsys, "check", str(new), "--against", str(old))
    assert code == 0
    assert "swap: engines E5 base Home -> blank (moved from Home to elsewhere)" in out
    _, out, _ = run(capsys, "check", str(new), "--against", str(old), "--json")
    assert json.loads(out)["result"]["changes"][0]["what"] == "swap"
    _, out, _ = run(capsys, "check", str(old), "--against", str(old))
    assert "Nothing moved" in out
