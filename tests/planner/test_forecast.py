"""The removals ahead: agreement with the simulation, tables that add up, directions of effects, and refusals."""

from __future__ import annotations

import json
import math
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
import small_tables
from click.testing import CliRunner
from line_fleet import line_fleet
from scipy.stats import kstest

from planner.causes_ahead import Ahead, Months, ahead, first_removal, gathered, month_edges
from planner.cli import frame
from planner.demand import Demand, away_chance, demands, mean_days, stay_weights
from planner.execute import Where
from planner.forecast import ForecastRequest, forecast, lasts
from planner.job import Scenario, run_log
from planner.picture import picture
from planner.schema.registry import OUTPUTS
from planner.shortage import covered_share, mean_number
from sim.errors import RequestError
from sim.events import KIND
from sim.fleet import Fleet

HERE = Where(kind="here")


def at_once(fleet: Fleet) -> Fleet:
    """The fleet with changes that take no time, so that an aircraft flies on and the other engine's dates stay."""
    return replace(fleet, engine_types=tuple(replace(t, engine_change_days=0.0) for t in fleet.engine_types))


def test_the_forecast_and_the_simulations_first_removals_agree_in_distribution() -> None:
    """Each engine's first removal, put through the forecast's own law, is even over 0 to 1 (probability integral
    transform; Kolmogorov and Smirnov's distance, one in a thousand), and causes come as often as forecast (four
    standard errors). Chance causes are made twice as frequent, spares suffice, and changes take no time. 150 runs
    of 12 engines."""
    fleet = at_once(line_fleet(aircraft=6, spares=16))
    fleet = replace(fleet, hazards=tuple(replace(h, scale=h.scale and h.scale / 2.0) for h in fleet.hazards))
    runs, years = 150, 4.0
    view = picture(fleet)
    one = {e.serial: ahead(view, e, t) for t, p in view.tails.items() for e in p.engines if e is not None}
    scenario = Scenario(fleet=fleet, horizon_days=years * 365.25, seed=11)
    rng = np.random.default_rng(4)
    even, causes = [], []
    for run in range(runs):
        first: dict[str, tuple[float, str]] = {}
        for row in run_log(scenario, "whole_engine", run).rows:
            if row[0] == KIND["removal"] and row[6] in one:
                first.setdefault(row[6], (row[1], row[8].split(" ")[0]))
        causes += [cause for _, cause in first.values()]
        for serial, law in one.items():
            day, cause = first.get(serial, (scenario.horizon_days, "planned"))
            alive = alive_at(law, day)
            # a planned cause (or the study's end) cuts the law off: what is left of it is drawn evenly
            even.append(rng.uniform(1.0 - alive, 1.0) if cause in ("margin", "limit", "planned") else 1.0 - alive)
    distance = kstest(even, "uniform").statistic
    assert distance < 1.95 / math.sqrt(len(even))
    edges = month_edges(fleet.settings.as_of, 48)
    expected: dict[str, float] = {}
    for law in one.values():
        found = first_removal(law, Months(edges))
        for column, (cause, _) in enumerate(found.causes):
            expected[cause] = expected.get(cause, 0.0) + float(found.by_month[:, column].sum())
    for cause, mean in expected.items():
        assert abs(causes.count(cause) / runs - mean) < 4.0 * math.sqrt(max(mean, 0.05) / runs) + 0.02, cause


def alive_at(one: Ahead, day: float) -> float:
    """Return the chance that no chance cause has struck by a day."""
    cycles, hours = np.array([one.use.cycles(day)]), np.array([one.use.hours(day)])
    return math.exp(-sum(float(gathered(chance, cycles, hours)[0]) for chance in one.chances))


def test_removals_a_year_and_engines_away_are_near_those_of_the_simulation() -> None:
    """Renewals, visits and queues in closed form against 24 runs: within a sixth over five years."""
    fleet = line_fleet(aircraft=12, spares=8)
    _, (demand,) = demands(fleet, "whole_engine", months=60)
    scenario = Scenario(fleet=fleet, horizon_days=float(demand.edges[-1]), seed=2)
    own = {e.engine_serial for e in fleet.engines}
    removals, away = 0, 0.0
    runs = 24
    for run in range(runs):
        left: dict[str, float] = {}
        for row in run_log(scenario, "whole_engine", run).rows:
            if row[0] == KIND["removal"] and row[6] in own:
                removals += 1
                left[row[6]] = row[1]
            elif row[0] in (KIND["pool"], KIND["install"]) and row[6] in left:
                away += row[1] - left.pop(row[6])
        away += sum(demand.edges[-1] - day for day in left.values())
    assert demand.rates.sum() == pytest.approx(removals / runs, rel=1 / 6)
    formula = away_chance(demand, mean_days(demand)).sum(axis=0) @ np.diff(demand.edges)
    assert formula == pytest.approx(away / runs, rel=1 / 6)


def test_months_causes_and_spans_add_up() -> None:
    found = forecast(line_fleet(aircraft=5, spares=2), ForecastRequest(months=36, effects=False))
    total = sum(row["removals"] for row in found.months)
    assert sum(row["removals"] for row in found.causes) == pytest.approx(total)
    spans = {(row["months"], row["cause"]): row["removals"] for row in found.spans}
    assert spans[36, "all"] == pytest.approx(total)
    assert sum(v for (months, cause), v in spans.items() if months == 12 and cause != "all") == pytest.approx(
        spans[12, "all"]
    )
    assert (60, "all") not in spans
    for row in found.months:
        assert row["removals_p10"] <= row["removals"] + 1.0
        assert row["removals_p90"] >= row["removals"] - 1.0


def test_every_row_has_the_columns_of_its_table() -> None:
    found = forecast(line_fleet(aircraft=3, spares=1), ForecastRequest(months=12))
    for name, rows in (
        ("removals_ahead", found.removals),
        ("engines_ahead", found.engines),
        ("months_ahead", found.months),
        ("month_causes", found.causes),
        ("spans_ahead", found.spans),
        ("use_effects", found.effects),
    ):
        assert rows
        assert all(set(row) == set(OUTPUTS[name].names) for row in rows), name


def test_one_more_spare_never_makes_a_month_shorter_of_engines() -> None:
    chances = []
    for spares in range(5):
        fleet = line_fleet(aircraft=8, spares=4)
        idle = [e.engine_serial for e in fleet.engines if e.place == "spare"][: 4 - spares]
        fewer = replace(fleet, engines=tuple(e for e in fleet.engines if e.engine_serial not in idle))
        fewer = replace(fewer, modules=tuple(m for m in fleet.modules if m.engine_serial not in idle))
        found = forecast(fewer, ForecastRequest(months=24, effects=False))
        chances.append([row["short_chance"] for row in found.months[:6]])
    assert (np.diff(np.array(chances), axis=0) <= 1e-12).all()


def test_more_use_and_a_harsher_base_bring_more_removals() -> None:
    found = forecast(line_fleet(aircraft=6, spares=2), ForecastRequest(months=60))
    by = {row["change"]: row["removals_60"] for row in found.effects}
    assert by["utilisation +10%"] > by["as planned"] > by["utilisation -10%"]
    assert by["all at Dune"] > by["as planned"] > by["all at Home"]
    assert by["derate -2 points"] >= by["as planned"] >= by["derate +2 points"]


def test_what_an_engine_has_lost_by_today_does_not_depend_on_how_it_will_be_flown() -> None:
    fleet = line_fleet(aircraft=4, spares=0, hazards=False)
    flown = replace(fleet, aircraft=tuple(replace(a, average_derate_frac=0.12) for a in fleet.aircraft))
    before, _ = demands(fleet, "whole_engine", months=12)
    after, _ = demands(fleet, "whole_engine", months=12, flown_as=flown)
    for serial, module in before.modules.items():
        assert after.modules[serial].loss == module.loss
        assert after.modules[serial].factor == module.factor
    first = [ahead(v, v.engines["E003"], "T002").planned[0] for v in (before, after)]
    assert first[0].cause == first[1].cause == "margin"
    assert first[1].day > first[0].day


def test_a_leased_in_engine_that_goes_back_takes_a_spare_for_good() -> None:
    fleet = line_fleet(aircraft=3, spares=2)
    engines = [
        replace(e, place="leased_in", lease_in_until_day=100.0) if e.engine_serial == "E001" else e
        for e in fleet.engines
    ]
    _, (demand,) = demands(replace(fleet, engines=tuple(engines)), "whole_engine", months=12)
    assert demand.taken[:3].tolist() == [0, 0, 0]
    assert demand.taken[4:].tolist() == [1] * 8


def test_stay_weights_hold_the_whole_stay() -> None:
    lengths = np.full(24, 30.0)
    for days in (0.0, 3.0, 45.0, 300.0):
        assert stay_weights(days, lengths).sum() * 30.0 == pytest.approx(days)


def test_spans_of_waiting_are_joined_before_they_are_counted() -> None:
    edges = np.array([0.0, 10.0, 20.0])
    spans = [(12.0, 15.0), (2.0, 6.0), (4.0, 11.0)]
    assert covered_share(spans, edges).tolist() == [0.8, 0.4]
    assert mean_number(spans, edges).tolist() == [1.0, 0.4]


def test_simulated_months_stand_beside_the_formula() -> None:
    fleet = line_fleet(aircraft=3, spares=1)
    found = forecast(fleet, ForecastRequest(months=12, runs=3, effects=False), where=HERE)
    total = sum(row["removals_simulated"] for row in found.months)
    assert 0.0 < total < 60.0
    assert all(0.0 <= row["short_chance_simulated"] <= 1.0 for row in found.months)


def test_how_long_a_spare_would_last_on_a_tail_is_said_in_words() -> None:
    view = picture(line_fleet(aircraft=3, spares=1))
    text = lasts(view, "E007", "T001")
    assert text.startswith("E007 on T001: ")
    assert "EGT margin used up on 20" in text
    with pytest.raises(RequestError, match="did you mean T001"):
        lasts(view, "E007", "T01")
    with pytest.raises(RequestError, match="engine serial"):
        lasts(view, "X", "T001")


@pytest.mark.parametrize(
    ("wrong", "match"),
    [
        ({"months": 0}, "1 to 480"),
        ({"runs": -1}, "0 \\(no simulation\\)"),
        ({"strategy": "nonesuch"}, "whole_engine"),
        ({"engine": "E001"}, "both --engine and --tail"),
    ],
)
def test_requests_that_cannot_be_are_refused(wrong: dict[str, object], match: str) -> None:
    with pytest.raises(RequestError, match=match):
        forecast(line_fleet(aircraft=2, spares=0), ForecastRequest(**wrong))  # type: ignore[arg-type]


def test_the_command_prints_a_table_and_an_object(tmp_path: Path) -> None:
    folder = small_tables.write(tmp_path / "fleet", small_tables.small_tables())
    page = CliRunner().invoke(frame, ["forecast", str(folder), "--months", "24"], catch_exceptions=False)
    assert page.exit_code == 0
    assert "Planning aid only" in page.stdout
    assert "first three causes" in page.stdout
    asked = ["forecast", str(folder), "--months", "24", "--no-effects", "--json"]
    answer = json.loads(CliRunner().invoke(frame, asked, catch_exceptions=False).stdout)
    assert answer["command"] == "forecast"
    removal = answer["result"]["removals"][0]
    assert {"engine_serial", "cause", "date_p10", "date_p50", "date_p90"} <= set(removal)
    month = answer["result"]["months"][0]
    assert {"month", "removals", "short_chance"} <= set(month)


def test_demand_scales_with_the_fleet() -> None:
    def rate(aircraft: int) -> float:
        found: Demand = demands(line_fleet(aircraft=aircraft, spares=0), "whole_engine", months=60)[1][0]
        return float(found.rates.sum()) / aircraft

    assert rate(20) == pytest.approx(rate(10), rel=0.1)
