"""The invented fleet: committed as written, whole at any size, and with a past that adds up."""

from __future__ import annotations

from pathlib import Path

import pytest
from click.testing import CliRunner

from planner.checks.rules import check
from planner.commands.demo import command
from planner.demo.make import fleet_tables, make
from planner.demo.types import DEMO_TYPES
from sim.errors import RequestError

ROOT = Path(__file__).resolve().parents[2]


def files(folder: Path) -> dict[str, bytes]:
    return {p.relative_to(folder).as_posix(): p.read_bytes() for p in folder.rglob("*.csv")}


def test_the_committed_fleet_is_what_the_command_writes(tmp_path: Path) -> None:
    result = CliRunner().invoke(command, [str(tmp_path / "fleet")])
    assert result.exit_code == 0, result.output
    assert files(tmp_path / "fleet") == files(ROOT / "demo_fleet")


def test_the_demo_gives_warnings_only() -> None:
    _, problems = check(ROOT / "demo_fleet")
    assert {p.severity for p in problems} == {"warns"}


def test_each_planted_complication_is_found() -> None:
    _, problems = check(ROOT / "demo_fleet")
    told = "\n".join(p.sentence() for p in problems)
    for words in (
        "Directive 2026-17",
        "it may not fly from that day",
        "the rating high of",
        "does not mate with",
        "2 weak engines",
        "ETOPS",
        "120 cycles left",
        "lease L-",
    ):
        assert words in told


@pytest.mark.parametrize("aircraft", [1, 4, 40])
def test_a_plain_fleet_gives_no_problem(tmp_path: Path, aircraft: int) -> None:
    make(tmp_path / "plain", aircraft=aircraft, seed=7, plain=True)
    _, problems = check(tmp_path / "plain")
    assert problems == ()


def test_another_seed_gives_another_fleet() -> None:
    one, other = (fleet_tables(aircraft=3, seed=seed, plain=True) for seed in (1, 2))
    assert [r["cycles_since_new"] for r in one["parts"]] != [r["cycles_since_new"] for r in other["parts"]]


def test_the_sets_of_parts_cost_what_the_scenario_says() -> None:
    # DEMO: 19 parts for about 4.0 M USD, 22 for about 11.2 M USD
    counts = {t.row["engine_type"]: (len(t.parts), sum(p[3] for p in t.parts)) for t in DEMO_TYPES}
    assert counts == {"N": (19, 4000), "W": (22, 11200)}


def test_every_parts_history_adds_up() -> None:
    tables = fleet_tables(aircraft=6, seed=3, plain=False)
    flown: dict[str, int] = {}
    for row in tables["part_history"]:
        flown[row["part_serial"]] = flown.get(row["part_serial"], 0) + int(row["cycles"])
    assert all(flown.get(p["part_serial"], 0) == p["cycles_since_new"] for p in tables["parts"])


def test_a_folder_that_holds_something_is_refused(tmp_path: Path) -> None:
    (tmp_path / "mine.txt").write_text("mine")
    with pytest.raises(RequestError, match="a new or empty folder"):
        make(tmp_path, aircraft=1)
    assert [p.name for p in tmp_path.iterdir()] == ["mine.txt"]


def test_a_size_out_of_range_is_refused(tmp_path: Path) -> None:
    with pytest.raises(RequestError, match="1 to 5000"):
        make(tmp_path / "x", aircraft=0)


def test_the_dirty_twin_tells_each_fault() -> None:
    _, problems = check(ROOT / "demo_fleet" / "dirty")
    told = "\n".join(p.sentence() for p in problems)
    for words in (
        "is negative",
        "looks like",
        "one part has one place",
        "names a currency",
        "the price is blank",
        "is a formula",
        "has spaces around it",
        "block time",
        "in the column of another rating",
        "the day of the rating change is missing",
    ):
        assert words in told, words
    assert {p.severity for p in problems} == {"stops", "warns"}
