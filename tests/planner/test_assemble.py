"""Records become the fleet that a study starts from."""

from __future__ import annotations

import datetime as dt
from pathlib import Path

import pytest
import small_tables

from planner.assemble import assemble, load
from planner.tables import read, read_sheets
from sim.errors import RecordsError, RequestError
from sim.fleet import Fleet


def fleet_of(tables: small_tables.Tables) -> Fleet:
    records, found = read_sheets(small_tables.sheets(tables))
    assert [p for p in found if p.severity == "stops"] == []
    return assemble(records)


def test_a_sound_folder_becomes_a_fleet_without_problems(tmp_path: Path) -> None:
    folder = small_tables.write(tmp_path / "fleet", small_tables.small_tables())
    _, found = read(folder)
    assert found == ()
    fleet = load(folder)
    assert (len(fleet.engines), len(fleet.modules), len(fleet.parts)) == (5, 10, 10)
    assert fleet.settings.as_of == dt.date(2026, 7, 1)
    assert fleet.settings.discount_rate_frac == 0.085
    assert fleet.parts[0].flown == (("high", 8000),)
    assert fleet.parts[0].made_day == (dt.date(2017, 3, 1) - dt.date(2026, 7, 1)).days
    assert fleet.module_types[1].behind == ("fan",)
    assert fleet.season == (1.0,) * 12


def test_dates_become_days_and_blanks_become_defaults() -> None:
    tables = small_tables.small_tables()
    tables["aircraft"][0] |= {"rating_until": "2027-07-01", "rating_after": "low", "entry_date": ""}
    tables["strategies"][0]["lease_in_after_days"] = ""
    tables["leases"] = [
        {"lease": "L", "tail": "T-1", "owner": "A", "return_date": "2026-07-31", "terms": "A", "exchange_rule": ""}
    ]
    tables["agreed"] = [{"date": "2026-06-30", "what": "removal", "serials": "E1 T-1"}]
    fleet = fleet_of(tables)
    assert fleet.aircraft[0].rating_until_day == 365.0
    assert fleet.aircraft[0].entry_day is None
    assert fleet.strategies[0].lease_in_after_days is None
    assert (fleet.leases[0].return_day, fleet.leases[0].exchange_rule) == (30.0, "own_back")
    assert (fleet.agreed[0].day, fleet.agreed[0].serials) == (-1.0, ("E1", "T-1"))


def test_what_stands_for_a_missing_table_is_said() -> None:
    tables = small_tables.small_tables()
    del tables["season"], tables["part_history"]
    fleet = fleet_of(tables)
    assert "season.csv is missing: use is spread evenly over the year" in fleet.assumptions
    assert "part_history.csv is missing: all cycles of a part count at the rating with its lowest limit" in (
        fleet.assumptions
    )
    assert {part.flown for part in fleet.parts} == {(("high", 8000),)}
    assert all(part.life_known for part in fleet.parts)


@pytest.mark.parametrize(
    ("change", "flown", "known"),
    [
        ({"cycles_since_new": ""}, 8000, False),
        ({"cycles_since_new": "8001"}, 8001, False),
        ({"cycles_since_new": "7990"}, 8000, True),
        ({"status_substantiated": ""}, 8000, False),
    ],
)
def test_life_is_known_only_where_the_records_prove_it(change: dict[str, str], flown: int, known: bool) -> None:
    tables = small_tables.small_tables()
    tables["parts"][0] |= change
    part = fleet_of(tables).parts[0]
    assert sum(cycles for _, cycles in part.flown) == flown
    assert part.life_known is known


def test_a_fleet_with_problems_is_not_loaded_and_all_of_them_are_told(tmp_path: Path) -> None:
    tables = small_tables.small_tables()
    tables["parts"][0]["cycles_since_new"] = "-5"
    tables["aircraft"][1]["cycles_per_year"] = "many"
    folder = small_tables.write(tmp_path / "fleet", tables)
    (folder / "work.csv").unlink()
    with pytest.raises(RecordsError, match="3 problems") as caught:
        load(folder)
    text = str(caught.value)
    assert "parts.csv row 2, column cycles_since_new: -5 is negative" in text
    assert "aircraft.csv row 3, column cycles_per_year: many is not a number" in text
    assert "work.csv: the table is missing" in text


@pytest.mark.parametrize("name", ["nowhere", "empty", "file.csv"])
def test_what_is_no_fleet_is_told_in_one_look(tmp_path: Path, name: str) -> None:
    (tmp_path / "empty").mkdir()
    (tmp_path / "file.csv").write_text("a,b\n")
    with pytest.raises(RequestError, match="expected"):
        load(tmp_path / name)
