"""``fit`` on whole fleets: planted laws come back through the records, and what is not told is said."""

from __future__ import annotations

import dataclasses
import datetime as dt
import math
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from planner.checks.rules import check
from planner.demo.make import fleet_tables
from planner.demo.write import write_tables
from planner.fit import FitAnswer, ask, of_records
from planner.fit_hazard_records import without_overlaps
from planner.fit_margin_answer import summer_end
from planner.fit_margin_records import Reading, split
from planner.records import Records, Rows
from planner.schema.registry import OUTPUTS
from sim.errors import RequestError

AS_OF = dt.date(2026, 7, 1)
Row = dict[str, Any]


@pytest.fixture(scope="module")
def records(tmp_path_factory: pytest.TempPathFactory) -> Records:
    folder = tmp_path_factory.mktemp("fleet")
    write_tables(folder, fleet_tables(aircraft=16, seed=3, plain=True))
    return check(folder)[0]


def with_rows(records: Records, table: str, rows: list[Row]) -> Records:
    """Return records with a table's rows replaced; columns that a row leaves out are None."""
    old = records[table]
    columns = {name: [row.get(name) for row in rows] for name in old.columns}
    new: Rows = dataclasses.replace(old, columns=columns, numbers=list(range(2, len(rows) + 2)))
    return dataclasses.replace(records, tables={**records.tables, table: new})


def rows_in(records: Records, table: str) -> list[Row]:
    columns = records[table].columns
    return [dict(zip(columns, values, strict=True)) for values in zip(*columns.values(), strict=True)]


def readings(
    records: Records, *, worse: float, seed: int, events: Callable[[int], str] = lambda number: ""
) -> list[Row]:
    """Return readings of every engine on the wing by the wear equation of METHOD.md, written out anew here: each module
    by its own cycles since restoration, steady and early loss ``worse`` times the table's, washes from the build on."""
    rng = np.random.default_rng(seed)
    tails = {row["tail"]: row for row in rows_in(records, "aircraft")}
    kinds = {row["engine_type"]: row for row in rows_in(records, "engine_types")}
    place = {row["base"]: row["environment"] for row in rows_in(records, "bases")}
    modules = rows_in(records, "modules")
    wear = {(row["engine_type"], row["rating"], row["module"]): row for row in rows_in(records, "wear")}
    washes = {(row["engine_type"], row["base"]): row for row in rows_in(records, "washes")}
    found = []
    for engine in rows_in(records, "engines"):
        if engine["place"] != "wing":
            continue
        tail, kind = tails[engine["tail"]], kinds[engine["engine_type"]]
        derate = kind["reference_derate_frac"] - (tail["average_derate_frac"] or 0.0)
        factor = place[tail["base"]] * (1.0 + kind["wear_frac_per_derate_frac"] * derate)
        hours = tail["hours_per_year"] / tail["cycles_per_year"]
        own = [row for row in modules if row["engine_serial"] == engine["engine_serial"]]
        since_build = engine["cycles_since_build"]
        span = min([row["cycles_since_restoration"] for row in own] + [since_build, 2.5 * tail["cycles_per_year"]])
        wash = washes[engine["engine_type"], tail["base"]]
        luck = float(np.exp(rng.normal(0.0, 0.06)))
        for number in range(26):
            back = span * (1.0 - number / 25.0)
            lost = 0.0
            for row in own:
                law = wear.get((engine["engine_type"], tail["rating"], row["module"]))
                if law is None:
                    continue
                cycles = row["cycles_since_restoration"] - back
                steady = law["loss_degC_per_1000_cycles"] + hours * law["loss_degC_per_1000_hours"]
                early = law["early_loss_degC"] * (1.0 - math.exp(-cycles / law["early_scale_cycles"]))
                lost += factor * luck * worse * (steady * cycles / 1000.0 + early)
            gained = wash["gain_degC"] * 0.5 ** ((since_build - back) % wash["every_cycles"] / wash["half_life_cycles"])
            found.append(
                {
                    "engine_serial": engine["engine_serial"],
                    "date": AS_OF - dt.timedelta(days=round(back / tail["cycles_per_year"] * 365.25)),
                    "cycles_since_install": round(since_build - back),
                    "margin_degC": 90.0 - lost + gained + rng.normal(0.0, kind["reading_noise_degC"]),
                    "event": events(number),
                }
            )
    return found


@pytest.fixture(scope="module")
def worn(records: Records) -> FitAnswer:
    """The fleet whose readings say that everything wears 1.3 times as fast as its table."""
    return of_records(with_rows(records, "margins", readings(records, worse=1.3, seed=5)))


def test_rows_hold_the_columns_of_the_schema(worn: FitAnswer) -> None:
    names = {
        "hazards": "hazards_fitted",
        "margins": "margins_fitted",
        "margin_types": "margin_types",
        "steps": "margin_steps",
        "trends": "removal_trends",
        "ahead": "margin_ahead",
    }
    assert set(worn.tables) == set(names)
    for result, table in names.items():
        for row in worn.tables[result]:
            assert set(row) == set(OUTPUTS[table].names), result


def test_readings_tell_the_table_how_fast_the_fleet_wears(worn: FitAnswer) -> None:
    sure = 0
    for row in worn.tables["margin_types"]:
        table = row["table_rate_degC_per_1000_cycles"]
        assert row["rate_degC_per_1000_cycles_low"] < 1.3 * table < row["rate_degC_per_1000_cycles_high"]
        assert row["early_loss_degC_low"] < 1.3 * row["table_early_loss_degC"] < row["early_loss_degC_high"]
        sure += row["rate_degC_per_1000_cycles_low"] > table
    assert sure >= 3


def test_engines_of_a_sandy_base_are_told_their_own_rate(worn: FitAnswer) -> None:
    rates: dict[str, list[float]] = {}
    for row in worn.tables["margins"]:
        if row["engine_type"] == "N" and row["rating"] in ("mid", "high"):
            rates.setdefault(row["tail"][:2], []).append(row["rate_degC_per_1000_cycles"])
    assert np.mean(rates["NB"]) > 1.25 * np.mean(rates["NA"])


def test_margins_now_are_the_planted_ones(records: Records, worn: FitAnswer) -> None:
    """The last reading of each engine is of the as-of date, so the planted margin is known up to its noise."""
    exact = {row["engine_serial"]: row for row in readings(with_quiet(records), worse=1.3, seed=5)}
    inside = [
        row["margin_low_degC"] <= exact[row["engine_serial"]]["margin_degC"] <= row["margin_high_degC"]
        for row in worn.tables["margins"]
    ]
    assert len(inside) > 20
    assert np.mean(inside) >= 0.85


def with_quiet(records: Records) -> Records:
    kinds = rows_in(records, "engine_types")
    return with_rows(records, "engine_types", [row | {"reading_noise_degC": 0.0} for row in kinds])


def test_a_date_is_later_the_surer_it_is_and_summer_is_judged(worn: FitAnswer) -> None:
    for row in worn.tables["margins"]:
        dates = [row[name] for name in ("date_p10", "date_p50", "date_p90") if row[name] is not None]
        assert dates == sorted(dates)
        assert 0.0 <= row["lasts_summer_chance"] <= 1.0
        if row["date_p90"] is not None and row["date_p90"] < row["summer_until"]:
            assert row["lasts_summer_chance"] < 0.11


def test_the_band_ahead_meets_the_removal_margin_on_its_dates(worn: FitAnswer) -> None:
    drawn = (dt.date(2026, 9, 1), dt.date(2028, 11, 1))
    row = next(row for row in worn.tables["margins"] if row["date_p50"] and drawn[0] < row["date_p50"] < drawn[1])
    ahead = [
        one
        for one in worn.tables["ahead"]
        if one["engine_serial"] == row["engine_serial"] and one["reading_degC"] is None
    ]
    before = [one for one in ahead if one["date"] < row["date_p50"]]
    after = [one for one in ahead if one["date"] > row["date_p50"]]
    assert before[-1]["margin_degC"] >= row["removal_margin_degC"] - 0.1
    assert after[0]["margin_degC"] <= row["removal_margin_degC"] + 0.1


def test_recorded_events_are_listed_and_dated(records: Records) -> None:
    def events(number: int) -> str:
        return {7: "wash", 14: "swap", 20: "visit"}.get(number, "")

    planted = readings(records, worse=1.0, seed=6, events=events)
    for number, row in enumerate(planted):
        row["margin_degC"] += 9.0 * (number % 26 >= 14) + 12.0 * (number % 26 >= 20)
    found = of_records(with_rows(records, "margins", planted))
    serial = planted[0]["engine_serial"]
    mine = [row for row in found.tables["steps"] if row["engine_serial"] == serial]
    assert [row["explained"] for row in mine] == ["wash", "swap or change of rating", "visit"]
    assert mine[2]["to_date"] == planted[20]["date"]
    assert mine[2]["from_date"] == planted[19]["date"]
    swaps = [row for row in found.tables["steps"] if row["explained"].startswith("swap")]
    assert np.mean([row["low"] < 9.0 < row["high"] for row in swaps]) > 0.8


def test_an_unrecorded_step_is_said_to_be_one(records: Records) -> None:
    planted = readings(records, worse=1.0, seed=7)
    for number, row in enumerate(planted[:26]):
        row["margin_degC"] -= 15.0 * (number >= 13)
    found = of_records(with_rows(records, "margins", planted))
    mine = [row for row in found.tables["steps"] if row["engine_serial"] == planted[0]["engine_serial"]]
    assert [row["explained"] for row in mine] == ["not in the records: damage or reading?"]
    assert abs((mine[0]["to_date"] - planted[13]["date"]).days) < 120
    assert any("no record explains" in sentence for sentence in found.sentences)


def removals(records: Records, *, seed: int) -> list[Row]:
    """Return past stretches of the N fleet's HPT: distress of shape 3 and scale 9,000 cycles in environment 1, life
    going as one over the environment, and unscheduled failures once in 60,000 hours."""
    rng = np.random.default_rng(seed)
    place = {row["base"]: row["environment"] for row in rows_in(records, "bases")}
    bases = {row["tail"]: place[row["base"]] for row in rows_in(records, "aircraft")}
    tails = {row["engine_serial"]: row["tail"] for row in rows_in(records, "engines")}
    found = []
    for module in rows_in(records, "modules"):
        tail = tails.get(module["engine_serial"] or "")
        if module["engine_type"] != "N" or module["module"] != "HPT" or not tail:
            continue
        for _ in range(12):
            start = float(rng.choice([0.0, 1_500.0]))
            scale = 9_000.0 / bases[tail]
            distress = scale * ((start / scale) ** 3 + rng.exponential()) ** (1 / 3) - start
            unscheduled = rng.exponential(60_000.0 / bases[tail]) / 1.8
            leaves = rng.uniform(2_000.0, 12_000.0)
            flown = round(min(distress, unscheduled, leaves))
            cause = {distress: "distress", unscheduled: "unscheduled", leaves: "none"}[
                min(distress, unscheduled, leaves)
            ]
            found.append(
                {
                    "serial": module["module_serial"],
                    "engine_type": "N",
                    "module": "HPT",
                    "cause": cause,
                    "run": "mature",
                    "cycles_at_install": round(start),
                    "cycles_at_removal": round(start) + flown,
                    "hours_at_install": 1.8 * start,
                    "hours_at_removal": 1.8 * (start + flown),
                    "removed_date": None,
                    "ended": "pulled" if cause == "none" else "failed",
                }
            )
    return found


def test_planted_hazards_come_back_on_their_own_clocks(records: Records) -> None:
    found = of_records(with_rows(records, "removals", removals(records, seed=8)))
    rows = {
        (row["cause"], row["run"]): row for row in found.tables["hazards"] if row["failures"] and row["module"] == "HPT"
    }
    distress, unscheduled = rows["distress", "mature"], rows["unscheduled", "mature"]
    assert distress["failures"] > 50
    assert distress["shape_low"] < 3.0 < distress["shape_high"]
    assert distress["scale_low"] < 9_000.0 < distress["scale_high"]
    assert distress["scale_high"] < 1.3 * distress["scale_low"]
    assert distress["constant_chance"] < 1e-6
    assert distress["fit_chance"] > 0.01
    assert distress["best_age"] is not None
    assert unscheduled["clock"] == "hours"
    assert unscheduled["scale_low"] < 60_000.0 < unscheduled["scale_high"]


def test_few_failures_hold_the_tables_shape_and_say_so(records: Records) -> None:
    some = [row for row in removals(records, seed=9) if row["cause"] == "distress"][:4]
    found = of_records(with_rows(records, "removals", some))
    row = next(row for row in found.tables["hazards"] if row["cause"] == "distress" and row["failures"] == 4)
    assert (row["shape"], row["shape_held"], row["shape_low"]) == (3.0, "yes", None)
    assert "too few" in row["note"]
    assert any("too few for a shape" in warning for warning in found.warnings)


def test_early_failures_are_a_chance_a_build(records: Records) -> None:
    rows = []
    for number, row in enumerate(removals(records, seed=10)):
        flown = row["cycles_at_removal"] - row["cycles_at_install"]
        early = number % 10 == 0
        flown = 80 if early else max(flown, 200)
        ended = {"cause": "early", "ended": "failed"} if early else {"cause": "none", "ended": "pulled"}
        rows.append(row | ended | {"cycles_at_removal": row["cycles_at_install"] + flown})
    found = of_records(with_rows(records, "removals", rows))
    row = next(row for row in found.tables["hazards"] if row["cause"] == "early" and row["failures"])
    assert row["within_chance"] == pytest.approx(0.1, abs=0.005)
    assert row["within_chance_low"] < 0.1 < row["within_chance_high"]


def test_without_early_failures_in_the_records_the_tables_chance_stays(records: Records) -> None:
    found = of_records(with_rows(records, "removals", removals(records, seed=8)))
    assert all(row["cause"] != "early" for row in found.tables["hazards"])
    assert any("no early failure" in warning for warning in found.warnings)


def test_a_fleet_that_fails_more_and_more_is_told_so(records: Records) -> None:
    rng = np.random.default_rng(11)
    rows = removals(records, seed=11)[:60]
    for row in rows:
        # most of them late: days before today go as the square of an even draw
        row |= {"removed_date": AS_OF - dt.timedelta(days=int(2_000 * rng.random() ** 2) + 1), "cause": "distress"}
        row["ended"] = "failed"
    found = of_records(with_rows(records, "removals", rows))
    trend = next(row for row in found.tables["trends"] if row["cause"] == "distress")
    assert trend["shape_low"] > 1.0
    assert trend["verdict"].startswith("more and more")


def test_a_stretch_told_twice_counts_once(records: Records) -> None:
    def row(first: int, last: int, ended: str) -> Row:
        return removals(records, seed=12)[0] | {
            "run": "first",
            "cause": "unscheduled" if ended == "failed" else "none",
            "ended": ended,
            "cycles_at_install": first,
            "cycles_at_removal": last,
            "hours_at_install": 2.0 * first,
            "hours_at_removal": 2.0 * last,
        }

    twice = of_records(with_rows(records, "removals", [row(0, 600, "failed"), row(0, 5_000, "pulled")]))
    once = of_records(with_rows(records, "removals", [row(0, 600, "failed"), row(600, 5_000, "pulled")]))
    assert any("overlaps" in warning for warning in twice.warnings)
    assert not any("overlaps" in warning for warning in once.warnings)
    assert twice.tables["hazards"] == once.tables["hazards"]
    assert without_overlaps([]) == ([], 0)


def test_readings_part_at_visits_and_where_the_count_falls() -> None:
    rows = [Reading(float(day), cycles, 40.0, event) for day, cycles, event in (
        (-90, 500, ""), (-80, 600, ""), (-70, 20, ""), (-60, 120, ""), (-50, 220, "visit"), (-40, 320, "")
    )]  # fmt: skip
    parts = split(rows)
    assert [len(part.rows) for part in parts] == [2, 2, 2]
    assert [part.first for part in parts] == [0.0, 0.0, 220.0]


@pytest.mark.parametrize(
    ("hot", "as_of", "until"),
    [
        ((), dt.date(2026, 7, 1), dt.date(2026, 10, 1)),
        ((), dt.date(2026, 11, 1), dt.date(2027, 10, 1)),
        ((30, 30, 25, 20, 15, 10, 10, 10, 15, 20, 25, 29), dt.date(2026, 7, 1), dt.date(2027, 3, 1)),
        ((30,) * 12, dt.date(2026, 7, 1), dt.date(2027, 7, 1)),
    ],
)
def test_summer_ends_where_the_base_says(hot: tuple[float, ...], as_of: dt.date, until: dt.date) -> None:
    assert summer_end(as_of, hot) == until


def test_a_fleet_without_records_of_either_kind_is_refused(records: Records) -> None:
    empty = with_rows(with_rows(records, "margins", []), "removals", [])
    with pytest.raises(RequestError, match=r"margins\.csv or removals\.csv"):
        of_records(empty)


def test_one_kind_of_records_is_enough(records: Records) -> None:
    only_readings = of_records(with_rows(records, "removals", []))
    assert only_readings.tables["margins"]
    assert any("removals.csv is missing" in warning for warning in only_readings.warnings)
    only_removals = of_records(with_rows(records, "margins", []))
    assert only_removals.tables["hazards"]
    assert not only_removals.tables["margins"]


def test_a_reading_of_a_serial_that_is_not_in_the_fleet_is_left_out_and_said(records: Records) -> None:
    rows = [*readings(records, worse=1.0, seed=13), {"engine_serial": "X1", "date": AS_OF, "margin_degC": 1.0}]
    found = of_records(with_rows(records, "margins", rows))
    assert any("not in engines.csv are left out: 1" in warning for warning in found.warnings)


def test_a_missing_fleet_is_refused(tmp_path: Path) -> None:
    with pytest.raises(RequestError):
        ask(tmp_path / "nowhere")


def test_odd_records_never_break_it(tmp_path: Path) -> None:
    """Readings and removals of any order, count and size: figures are finite, and nothing is raised."""
    write_tables(tmp_path, fleet_tables(aircraft=4, seed=3, plain=True))
    small = check(tmp_path)[0]
    serials = [row["engine_serial"] for row in rows_in(small, "engines")]
    modules = rows_in(small, "modules")
    for seed in range(8):
        rng = np.random.default_rng(seed)
        seen = [
            {
                "engine_serial": str(rng.choice(serials)),
                "date": AS_OF - dt.timedelta(days=int(rng.integers(-5, 900))),
                "cycles_since_install": int(rng.choice([0, 1, 100, 5_000, 500_000])),
                "margin_degC": float(rng.choice([-100.0, 20.0, 20.5, 300.0])),
                "event": str(rng.choice(["", "", "wash", "swap", "visit"])),
            }
            for _ in range(rng.integers(0, 40))
        ]
        past = []
        for _ in range(rng.integers(1, 40)):
            module, start = modules[rng.integers(len(modules))], int(rng.choice([0, 100, 500_000]))
            end = start + int(rng.choice([0, 1, 100, 3_000]))
            past.append(
                {
                    "serial": module["module_serial"],
                    "engine_type": module["engine_type"],
                    "module": str(rng.choice([module["module"], "HPT"])),
                    "cause": str(rng.choice(["distress", "unscheduled", "early", "none", "margin"])),
                    "run": str(rng.choice(["first", "mature"])),
                    "cycles_at_install": start,
                    "cycles_at_removal": end,
                    "hours_at_install": 2.0 * start,
                    "hours_at_removal": 2.0 * float(rng.choice([start, end])),
                    "removed_date": AS_OF - dt.timedelta(days=int(rng.integers(0, 4_000))),
                    "ended": str(rng.choice(["failed", "pulled", "still_on"])),
                    "cycles_last_seen_good": start if rng.random() < 0.3 else None,
                }
            )
        found = of_records(with_rows(with_rows(small, "margins", seen), "removals", past))
        for rows in found.tables.values():
            for row in rows:
                assert all(math.isfinite(value) for value in row.values() if isinstance(value, float)), row
