"""The invented fleet: committed as written, whole at any size, with a past that adds up and faults that are found."""

from __future__ import annotations

from collections import Counter
from fractions import Fraction
from pathlib import Path
from typing import Any

import pytest
from click.testing import CliRunner

from planner.assemble import load
from planner.checks.rules import check
from planner.cli import frame
from planner.demo.dirty import soil
from planner.demo.make import Demo, before_dirt, fleet, make
from planner.demo.sub_fleets import counts
from planner.demo.types import DEMO_TYPES
from sim.errors import Problem, RequestError
from sim.events import KIND
from sim.fleet import Fleet
from sim.removal import planned_removal
from sim.setting_out import set_out
from sim.spec import setup
from sim.start import names
from sim.world import World, simulate

ROOT = Path(__file__).resolve().parents[2]
Rows = list[dict[str, Any]]


@pytest.fixture(scope="module")
def demo() -> Demo:
    return fleet()


@pytest.fixture(scope="module")
def problems() -> tuple[Problem, ...]:
    return check(ROOT / "demo_fleet")[1]


@pytest.fixture(scope="module")
def loaded() -> Fleet:
    return load(ROOT / "demo_fleet")


def set_out_world(loaded: Fleet) -> World:
    ready = setup(loaded, "whole_engine", horizon_days=365.0)
    world = World(ready, names(ready), seed=1, run=0)
    set_out(world)
    return world


def files(folder: Path) -> dict[str, bytes]:
    return {p.relative_to(folder).as_posix(): p.read_bytes() for p in folder.rglob("*.csv")}


def test_the_committed_fleet_is_what_the_command_writes(tmp_path: Path) -> None:
    result = CliRunner().invoke(frame, ["demo", str(tmp_path / "fleet")])
    assert result.exit_code == 0, result.output
    assert files(tmp_path / "fleet") == files(ROOT / "demo_fleet")


def test_it_holds_the_sub_fleets_of_the_scenario(demo: Demo) -> None:
    today = [row for row in demo.tables["aircraft"] if not row["entry_date"]]
    assert Counter((row["sub_fleet"], row["rating"]) for row in today) == {
        ("NA", "high"): 7,
        ("NA", "mid"): 5,
        ("NB", "mid"): 7,
        ("NB", "high"): 3,
        ("NC", "low"): 6,
        ("WA", "plus"): 8,
        ("WB", "base"): 4,
    }
    assert [row["entry_date"][:4] for row in demo.tables["aircraft"] if row["entry_date"]] == ["2028", "2028"]
    assert [row["sub_fleet"] for row in demo.tables["aircraft"] if row.get("exit_date")] == ["WB"]
    assert len(demo.tables["leases"]) == 20


def test_it_holds_the_spares_of_the_scenario(demo: Demo) -> None:
    places = Counter((e["engine_type"], e["place"]) for e in demo.tables["engines"] if e["place"] != "wing")
    assert places == {
        ("N", "shop"): 2,
        ("N", "leased_in"): 1,
        ("N", "spare"): 2,
        ("W", "shop"): 1,
        ("W", "spare"): 2,
    }
    shelf = Counter((m["engine_type"], m["module"]) for m in demo.tables["modules"] if not m.get("engine_serial"))
    assert shelf == {
        ("N", "fan-booster"): 1,
        ("N", "LPT"): 2,
        ("N", "HPT"): 1,
        ("N", "gearbox"): 1,
        ("W", "fan"): 1,
        ("W", "LPT"): 1,
        ("W", "gearbox"): 1,
    }
    assert [m["ready_date"] for m in demo.tables["modules"] if m.get("place") == "shop"] == ["2026-08-20"]


def test_the_sets_of_parts_cost_what_the_scenario_says() -> None:
    # 19 parts for about 4.0 M USD, 22 for about 11.2 M USD
    sets = {t.row["engine_type"]: (len(t.parts), sum(price for _, _, _, price, _ in t.parts)) for t in DEMO_TYPES}
    assert sets == {"N": (19, 4000), "W": (22, 11200)}


def test_shares_of_wear_and_of_hazards_add_up_to_the_engine() -> None:
    for kind in DEMO_TYPES:
        assert sum(m.wear_share for m in kind.modules) == pytest.approx(1.0)
        assert sum(m.unscheduled_share for m in kind.modules) == pytest.approx(1.0)
        assert sum(m.distress_share for m in kind.modules) == pytest.approx(1.0)


def test_hazards_of_modules_combine_to_those_of_the_engine(demo: Demo) -> None:
    # unscheduled: rates add up to 0.018 in 1,000 hours; distress: Weibull of shape 3 with scale 14,200 first run
    rows = [h for h in demo.tables["hazards"] if h["engine_type"] == "N" and h["run"] == "first"]
    assert sum(1000.0 / h["scale"] for h in rows if h["cause"] == "unscheduled") == pytest.approx(0.018, rel=1e-4)
    at = 9_000.0
    hazard = sum((at / h["scale"]) ** 3 for h in rows if h["cause"] == "distress")
    assert hazard == pytest.approx((at / 14_200.0) ** 3, rel=1e-4)
    survives = 1.0
    for h in rows:
        survives *= 1.0 - h["probability_within"] if h["cause"] == "early" else 1.0
    assert survives == pytest.approx(0.98, abs=1e-5)


def test_every_parts_history_adds_up_and_leaves_life(demo: Demo) -> None:
    flown: dict[str, int] = {}
    used: dict[str, Fraction] = {}
    limits = {
        (row["part_number"], row["rating"]): row["limit_cycles"]
        for row in demo.tables["part_limits"]
        if not row.get("directive")
    }
    numbers = {p["part_serial"]: p["part_number"] for p in demo.tables["parts"]}
    for row in demo.tables["part_history"]:
        serial = row["part_serial"]
        flown[serial] = flown.get(serial, 0) + row["cycles"]
        used[serial] = used.get(serial, Fraction(0)) + Fraction(row["cycles"], limits[numbers[serial], row["rating"]])
    assert all(flown.get(p["part_serial"], 0) == p["cycles_since_new"] for p in demo.tables["parts"])
    assert max(used.values()) < 1


def test_a_tail_has_flown_what_its_engines_flew_on_it(demo: Demo) -> None:
    # one part of position 1 stands for it: over all engines that hung there the stretches add up to the tail's cycles
    links = [row for row in demo.tables["installs"] if row["position"] == 1]
    assert links
    by_tail: dict[str, int] = {}
    cycles_now = {e["engine_serial"]: e["cycles_since_new"] for e in demo.tables["engines"]}
    by_engine: dict[str, Rows] = {}
    for row in demo.tables["installs"]:
        if row["position"]:
            by_engine.setdefault(row["serial"], []).append(row)
    for serial, stays in by_engine.items():
        ends = [row["cycles_on"] for row in stays[1:]] + [cycles_now[serial]]
        for row, end in zip(stays, ends, strict=True):
            if row["position"] == 1:
                by_tail[row["parent_serial"]] = by_tail.get(row["parent_serial"], 0) + end - row["cycles_on"]
    today = [row for row in demo.tables["aircraft"] if not row["entry_date"]]
    assert {row["tail"]: row["cycles_since_new"] for row in today} == {
        row["tail"]: by_tail[row["tail"]] for row in today
    }


def test_engines_on_a_wing_have_margin_left_and_the_last_reading_says_so(demo: Demo) -> None:
    tables = demo.tables
    new = {(r["engine_type"], r["rating"]): r["new_margin_degC"] for r in tables["ratings"]}
    floor = {r["engine_type"]: r["removal_margin_degC"] for r in tables["engine_types"]}
    rating = {row["tail"]: row["rating"] for row in tables["aircraft"]}
    last = {row["engine_serial"]: row["margin_degC"] for row in tables["margins"]}
    lost: dict[str, float] = {}
    for module in tables["modules"]:
        serial = module.get("engine_serial", "")
        lost[serial] = lost.get(serial, 0.0) + module["margin_lost_degC"]
    gaps = []
    for engine in tables["engines"]:
        if engine["place"] == "wing":
            serial = engine["engine_serial"]
            margin = new[engine["engine_type"], rating[engine["tail"]]] - lost[serial]
            assert margin > floor[engine["engine_type"]] - 5.0  # a wash may carry it a little below
            if serial in last:
                gaps.append(last[serial] - margin)
    # readings stand above by what is left of the last wash (0 to 5 degC), with noise of 2.5 and a few outliers
    assert 0.5 < sorted(gaps)[len(gaps) // 2] < 4.0


def test_past_removals_are_told_apart_as_failed_pulled_and_still_on(demo: Demo) -> None:
    ended = Counter(row["ended"] for row in demo.tables["removals"])
    assert min(ended["failed"], ended["pulled"], ended["still_on"]) > 50
    assert all(row["cycles_at_removal"] > row["cycles_at_install"] for row in demo.tables["removals"])
    # no module is told twice over the same cycles since restoration
    exposure = sum(r["cycles_at_removal"] - r["cycles_at_install"] for r in demo.tables["removals"])
    flown = sum(m["cycles_since_new"] for m in demo.tables["modules"] if m.get("engine_serial"))
    assert exposure == flown


def test_the_demo_gives_warnings_only(problems: tuple[Problem, ...]) -> None:
    assert {p.severity for p in problems} == {"warns"}


# what is planted, the check that tells it, and how often
_TOLD = {
    "fails_on_one_part": ("returns_within_a_year_leave_the_cycles_that_terms_ask", "1 part(s)"),
    "little_left": ("leased_aircraft_have_no_engine_weak_in_life_and_margin", "120 cycles left"),
    "other_owner": ("modules_fly_on_engines_of_their_owner", "it must go back"),
    "two_weak": ("aircraft_have_at_most_one_weak_engine", "2 weak engines"),
    "two_weak_etops": ("aircraft_have_at_most_one_weak_engine", "ETOPS 120 min has 2 weak engines"),
    "old_standard": ("spare_modules_mate_with_every_engine", "does not mate with"),
    "rating_expires": ("ratings_do_not_expire", "ends on 2027-06-30"),
    "directive": ("announced_cuts_leave_life", "Directive 2026-17"),
}


@pytest.mark.parametrize("name", _TOLD)
def test_each_planted_complication_is_told_by_its_own_rule(
    name: str, demo: Demo, problems: tuple[Problem, ...]
) -> None:
    rule, words = _TOLD[name]
    planted = next(one for one in demo.planted if one.name == name)
    told = [p for p in problems if p.rule == rule and words in p.sentence()]
    assert any(serial in p.sentence() for p in told for serial in planted.serials)


def test_nothing_but_what_is_planted_is_told(demo: Demo, problems: tuple[Problem, ...]) -> None:
    serials = {serial for planted in demo.planted for serial in planted.serials}
    strangers = [p.sentence() for p in problems if not any(serial in p.sentence() for serial in serials)]
    assert strangers == []


def test_the_directive_hits_six_disks_and_two_of_them_may_not_fly_from_its_day(
    demo: Demo, problems: tuple[Problem, ...]
) -> None:
    told = [p.sentence() for p in problems if p.rule == "announced_cuts_leave_life"]
    assert len(told) == 6
    assert sum("it may not fly from that day" in sentence for sentence in told) == 2


def test_both_engines_of_an_etops_tail_reach_a_limit_within_days(demo: Demo, loaded: Fleet) -> None:
    planted = next(one for one in demo.planted if one.name == "away_together")
    tail = next(row for row in loaded.aircraft if row.tail == planted.serials[0])
    assert tail.etops_minutes >= 120
    days = sorted(_planned_day(loaded, serial) for serial in planted.serials[1:])
    assert 0.0 < days[0] < days[1] < days[0] + 30.0


def _planned_day(loaded: Fleet, serial: str) -> float:
    world = set_out_world(loaded)
    for aircraft in world.aircraft:
        for engine in aircraft.engines:
            if engine is not None and engine.serial == serial:
                cycles = planned_removal(engine, aircraft.flying, 0.0, aircraft.until).cycles
                return world.season.day(cycles / aircraft.cycles_per_year)
    raise AssertionError(f"{serial} is on no wing")


def test_one_spare_of_type_w_fits_only_the_lower_rating(demo: Demo, loaded: Fleet) -> None:
    serial = next(one for one in demo.planted if one.name == "base_only").serials[0]
    world = set_out_world(loaded)
    engine = next(e for e in world.engine_pools["W"].engines if e.serial == serial)
    fits = {a.row.rating: world.matching.fit_value(a, 0, engine) for a in world.aircraft if a.row.engine_type == "W"}
    assert fits["plus"] == float("inf") != fits["base"]


def test_engines_flown_at_two_ratings_count_at_both(demo: Demo, loaded: Fleet) -> None:
    planted = next(one for one in demo.planted if one.name == "two_ratings")
    inside = {m.module_serial for m in loaded.modules if m.engine_serial == planted.serials[0]}
    flown = [dict(p.flown) for p in loaded.parts if p.module_serial in inside]
    assert any(len([r for r, cycles in one.items() if cycles]) > 1 for one in flown)


def test_removals_are_about_as_many_as_the_scenario_says(loaded: Fleet) -> None:
    # the scenario: roughly 18 removals of type N a year and 9 of type W
    ready = setup(loaded, "whole_engine", horizon_days=3652.0)
    known, runs = names(ready), 4
    removal = KIND["removal"]
    rows = [row for run in range(runs) for row in simulate(ready, known, seed=1, run=run).rows if row[0] == removal]
    by_type = Counter(row[6][0] for row in rows if "/" not in row[6])  # rented engines are named lease/TAIL/n
    assert 15 < by_type["N"] / runs / 10 < 23
    assert 7 < by_type["W"] / runs / 10 < 11


def test_planned_removals_of_type_n_gather_in_2027_and_2028(loaded: Fleet) -> None:
    world = set_out_world(loaded)
    years: Counter[int] = Counter()
    for aircraft in world.aircraft:
        if aircraft.row.engine_type == "N":
            for engine in aircraft.engines:
                assert engine is not None
                cycles = planned_removal(engine, aircraft.flying, 0.0, aircraft.until).cycles
                years[world.season.date(world.season.day(cycles / aircraft.cycles_per_year)).year] += 1
    assert years[2027] + years[2028] > 1.25 * (years[2029] + years[2030])


@pytest.mark.parametrize(("aircraft", "seed"), [(1, 7), (4, 2), (13, 5), (40, 7)])
def test_a_plain_fleet_gives_no_problem(tmp_path: Path, aircraft: int, seed: int) -> None:
    make(tmp_path / "plain", aircraft=aircraft, seed=seed, plain=True)
    assert check(tmp_path / "plain")[1] == ()
    assert not (tmp_path / "plain" / "dirty").exists()


@pytest.mark.parametrize("aircraft", [1, 2, 9])
def test_a_small_fleet_with_complications_gives_warnings_only(tmp_path: Path, aircraft: int) -> None:
    make(tmp_path / "small", aircraft=aircraft)
    assert {p.severity for p in check(tmp_path / "small")[1]} <= {"warns"}


def test_a_larger_fleet_holds_the_smaller_one() -> None:
    small, large = (fleet(aircraft=n, seed=3, plain=True).tables for n in (6, 9))
    for table, key in (("aircraft", "tail"), ("engines", "engine_serial"), ("modules", "module_serial")):
        assert {row[key] for row in small[table]} <= {row[key] for row in large[table]}
    steady = ("tail", "rating", "entry_date", "hours_per_year", "base", "owner")
    tails = {row["tail"]: [row.get(name) for name in steady] for row in large["aircraft"]}
    assert all(tails[row["tail"]] == [row.get(name) for name in steady] for row in small["aircraft"])
    leases = {row["lease"]: row for row in large["leases"]}
    assert all(leases[row["lease"]] == row for row in small["leases"])


def test_no_sub_fleet_shrinks_when_the_fleet_grows() -> None:
    assert counts(40) == [12, 10, 6, 8, 4]
    for aircraft in range(1, 300):
        fewer, more = counts(aircraft), counts(aircraft + 1)
        assert sum(more) == aircraft + 1
        assert all(a <= b for a, b in zip(fewer, more, strict=True))


def test_another_seed_gives_another_fleet() -> None:
    one, other = (fleet(aircraft=3, seed=seed, plain=True).tables for seed in (1, 2))
    assert [r["cycles_since_new"] for r in one["parts"]] != [r["cycles_since_new"] for r in other["parts"]]


def test_spares_and_slots_grow_with_the_fleet() -> None:
    tables = fleet(aircraft=80, plain=True).tables
    off_wing = Counter(e["engine_type"] for e in tables["engines"] if e["place"] != "wing")
    assert off_wing == {"N": 10, "W": 6}
    assert [row["inductions_per_month"] for row in tables["shops"]] == [2.0, 1.0, 1.6, 0.8]


def test_a_folder_that_holds_something_is_refused(tmp_path: Path) -> None:
    (tmp_path / "mine.txt").write_text("mine")
    with pytest.raises(RequestError, match="a new or empty folder"):
        make(tmp_path, aircraft=1)
    assert [p.name for p in tmp_path.iterdir()] == ["mine.txt"]


def test_a_size_out_of_range_is_refused_and_nothing_is_left(tmp_path: Path) -> None:
    with pytest.raises(RequestError, match="1 to 5000"):
        make(tmp_path / "x", aircraft=0)
    assert list(tmp_path.iterdir()) == []
    assert CliRunner().invoke(frame, ["demo", str(tmp_path / "x"), "--aircraft", "0"]).exit_code == 2


def test_the_dirty_twin_tells_each_fault_where_it_stands() -> None:
    _, found = check(ROOT / "demo_fleet" / "dirty")
    _, faults = soil(before_dirt())
    told = {(p.file, p.row, p.column, p.rule) for p in found}
    missing = [fault for fault in faults if (fault.file, fault.row, fault.column, fault.rule) not in told]
    assert missing == []
    assert len({fault.what for fault in faults}) == 16
    assert {p.severity for p in found} == {"stops", "warns"}
