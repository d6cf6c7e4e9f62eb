"""Compare: the answer's tables, same digits for any number of workers, what-ifs, and one-look errors."""

from __future__ import annotations

import json
from dataclasses import replace
from pathlib import Path

import pytest
from builders import exponential_removals, tiny_fleet

from planner.cli import main
from planner.compare import comparison
from planner.execute import Where
from planner.scenario import WhatIf, apply, same_money, stock_held, with_stock
from planner.story import story
from planner.study import CompareRequest, from_settings, run_study, scenarios, to_settings
from sim.errors import RequestError
from sim.fleet import Fleet, Holding

ROOT = Path(__file__).resolve().parents[2]
DEMO = str(ROOT / "demo_fleet")
HERE = Where(kind="here")


def busy() -> Fleet:
    fleet = exponential_removals(tiny_fleet(tails=4, spares=1), per_hour=1 / 700)
    return replace(fleet, settings=replace(fleet.settings, horizon_years=3.0))


def test_the_tables_agree_with_one_another() -> None:
    answer = comparison(run_study(busy(), CompareRequest(runs=6), where=HERE))
    for row in answer.strategies:
        lines = sum(c["usd_mean"] for c in answer.costs if c["strategy"] == row["strategy"])
        assert lines == pytest.approx(row["total_usd_mean"], rel=1e-9)
        lost = sum(d["aircraft_days_mean"] for d in answer.downtime if d["strategy"] == row["strategy"])
        assert lost == pytest.approx(row["aircraft_days_lost_mean"])
        assert row["total_usd_p10"] is None  # percentiles need 40 runs
    pairs = [(d["a"], d["b"]) for d in answer.differences]
    assert pairs == [("whole_engine", "exchange"), ("whole_engine", "cheapest"), ("exchange", "cheapest")]
    for row in answer.differences:
        totals = {s["strategy"]: s["total_usd_mean"] for s in answer.strategies}
        assert row["total_usd_mean"] == pytest.approx(totals[row["a"]] - totals[row["b"]], abs=1e-3)
        assert row["total_usd_low"] <= row["total_usd_mean"] <= row["total_usd_high"]


def test_one_and_two_workers_give_the_same_digits() -> None:
    request = CompareRequest(strategies=("whole_engine", "exchange"), runs=4)
    one = run_study(busy(), request, where=HERE)
    two = run_study(busy(), request, where=Where(kind="pool", workers=2))
    assert comparison(one).as_result() == comparison(two).as_result()


def test_strategies_keep_the_order_asked_for() -> None:
    found, _ = scenarios(busy(), CompareRequest(strategies=("exchange", "whole_engine")))
    assert list(found) == ["exchange", "whole_engine"]


def test_a_request_survives_its_journey_as_json() -> None:
    request = CompareRequest(
        strategies=("exchange",),
        runs=3,
        what_if=WhatIf(stock=(Holding(engine_type="T", module="engine", count=2),), fuel_price_usd_per_kg=1.0),
        stock_of=(("exchange", (Holding(engine_type="T", module="fan", count=1),)),),
    )
    assert from_settings(json.loads(json.dumps(to_settings(request)))) == request


def test_more_spares_never_lose_more_days_on_average() -> None:
    lost = []
    for count in (0, 1, 3):
        stock = (Holding(engine_type="T", module="engine", count=count),)
        study = run_study(
            busy(), CompareRequest(strategies=("whole_engine",), runs=8, what_if=WhatIf(stock=stock)), where=HERE
        )
        lost.append(sum(r.days_lost.sum() for r in study.rows["whole_engine"]))
    assert lost[0] >= lost[1] >= lost[2]


def test_stock_is_what_was_asked_for() -> None:
    fleet = with_stock(
        busy(), (Holding(engine_type="T", module="engine", count=3), Holding(engine_type="T", module="core", count=2))
    )
    assert stock_held(fleet) == {("T", "engine"): 3, ("T", "core"): 2}
    assert stock_held(with_stock(fleet, (Holding(engine_type="T", module="engine", count=0),)))["T", "engine"] == 0


def test_the_same_money_never_costs_more() -> None:
    fleet = with_stock(busy(), (Holding(engine_type="T", module="core", count=8),))
    stock = {h.module: h.count for h in same_money(fleet, fleet.strategies[0])}
    # eight cores with their disks are 8.32 M USD: two engines of 3.6525 M USD beside the one held
    assert stock == {"engine": 3, "fan": 0, "core": 0}
    assert same_money(fleet, fleet.strategies[1]) == ()


@pytest.mark.parametrize(
    ("what_if", "words"),
    [
        (WhatIf(horizon_years=0.0), "horizon: found 0 years, expected more than 0"),
        (WhatIf(fuel_price_usd_per_kg=-1.0), "fuel price: found -1, expected at least 0"),
        (WhatIf(stock=(Holding(engine_type="X", module="engine", count=1),)), "expected an engine type: T"),
        (WhatIf(stock=(Holding(engine_type="T", module="wheel", count=1),)), "an item of type T: engine, fan, core"),
        (WhatIf(stock=(Holding(engine_type="T", module="fan", count=-1),)), "found -1, expected 0 or more"),
    ],
)
def test_what_cannot_be_is_refused(what_if: WhatIf, words: str) -> None:
    with pytest.raises(RequestError, match=words):
        apply(busy(), what_if)


def test_a_story_tells_what_befell_a_serial() -> None:
    found, _ = scenarios(tiny_fleet(), CompareRequest(strategies=("whole_engine",)))
    told = [words for _, _, words in story(found["whole_engine"], "whole_engine", "E1")]
    assert told[0].startswith("flew 1,000 cycles and 1,000 h on A1")
    assert any("removed from A1: limit core" in words for words in told)
    with pytest.raises(RequestError, match="a serial or tail of the fleet"):
        story(found["whole_engine"], "whole_engine", "nobody")


@pytest.mark.parametrize(
    ("words", "code", "told"),
    [
        (["compare", "no_such_folder"], 1, "no_such_folder"),
        (["compare", DEMO, "--strategy", "nobody", "--no-save"], 1, "nobody"),
        (["compare", DEMO, "--horizon", "0", "--no-save"], 1, "horizon"),
        (["compare", DEMO, "--runs", "0", "--no-save"], 1, "--runs"),
        (["compare", DEMO, "--holding", "N:engine", "--no-save"], 1, "--holding"),
        (["compare", DEMO, "--story", "nobody", "--no-save"], 1, "nobody"),
        (["compare", DEMO, "--nonsense"], 2, "nonsense"),
        (["compare", DEMO, "--seed", "-1"], 2, "--seed"),
    ],
)
def test_a_bad_request_is_one_look_and_no_traceback(
    words: list[str], code: int, told: str, capsys: pytest.CaptureFixture[str]
) -> None:
    with pytest.raises(SystemExit) as ended:
        main(words)
    out, err = capsys.readouterr()
    assert ended.value.code == code
    assert told in err
    assert "Traceback" not in err
    assert out == ""


def test_the_json_object_keeps_its_contract(capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as ended:
        main(["compare", DEMO, "--runs", "2", "--horizon", "1", "--workers", "1", "--no-save", "--json"])
    assert ended.value.code == 0
    body = json.loads(capsys.readouterr().out)
    assert body["command"] == "compare"
    assert {"version", "inputs", "seed", "basis", "warnings", "result"} <= set(body)
    wanted = {
        "strategies": {"strategy", "runs", "total_usd_mean", "cash_usd_mean", "usd_per_cycle_mean", "fuel_kg_mean"},
        "differences": {"a", "b", "total_usd_mean", "total_usd_low", "total_usd_high", "cheaper_chance"},
        "costs": {"strategy", "year", "line", "usd_mean"},
        "sweep": {"horizon_years", "basis", "cheapest"},
    }
    for table, keys in wanted.items():
        assert keys <= set(body["result"][table][0]), table
