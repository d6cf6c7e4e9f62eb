"""The question ``engine`` on rows: coefficients under the fleet's own modules, refusals, wear conversion, worth."""

from __future__ import annotations

import datetime as dt
from typing import Any

import pytest

from planner.engine import NEVER_INFERRED, EngineAnswer, answer, fuel_share, models
from planner.gas_paths import components_of, conditions_of, type_cycle
from planner.module_worth import conditions, restorations, spare_on_engine
from planner.schema.engine_outputs import TABLES
from planner.wear_in_degrees import wear_in_degrees
from sim.cycle_inputs import Change
from sim.errors import NoSolutionError, OutOfRangeError, RequestError
from sim.fleet import (
    Aircraft,
    Base,
    Engine,
    EngineType,
    Fleet,
    Module,
    ModuleType,
    Rating,
    Settings,
    WearRow,
    Work,
)
from sim.influence import influence

MODULES = ("fan-booster", "HPC", "combustor", "HPT", "LPT", "accessory gearbox")


def some_rows(**changed: Any) -> dict[str, list[dict[str, Any]]]:
    """Return the rows of one two-spool type with three ratings; ``changed`` replaces cells of its engine_types row."""
    kind = {
        "engine_type": "N",
        "bypass_ratio": 6.2,
        "overall_pressure_ratio": 34.0,
        "redline_degC": 925.0,
        "corner_point_degC": 30.0,
        "egt_per_ambient": 3.2,
    }
    ratings = [("low", 90.0, 112.0), ("mid", 99.0, 88.0), ("high", 108.0, 60.0)]
    return {
        "engine_types": [{**kind, **changed}],
        "ratings": [
            {"engine_type": "N", "rating": name, "thrust_kN": thrust, "new_margin_degC": margin}
            for name, thrust, margin in ratings
        ],
        "module_types": [{"engine_type": "N", "module": module} for module in MODULES],
        "cycles": [],
    }


def asked(rows: dict[str, list[dict[str, Any]]]) -> EngineAnswer:
    return answer(models(rows)[0], module_types=rows["module_types"])


@pytest.fixture(scope="module")
def found() -> EngineAnswer:
    return asked(some_rows())


def test_the_tables_hold_the_columns_of_the_schema(found: EngineAnswer) -> None:
    for name, rows in (
        ("stations", found.stations),
        ("coefficients", found.coefficients),
        ("ratings_heat", found.ratings),
        ("ambient", found.ambient),
    ):
        assert rows
        assert set(rows[0]) == set(TABLES[name].names)


def test_coefficients_stand_under_the_fleets_own_modules(found: EngineAnswer) -> None:
    by_component = {row["component"]: row["module"] for row in found.coefficients}
    assert by_component == {
        "fan": "fan-booster",
        "booster": "fan-booster",
        "hpc": "HPC",
        "combustor": "combustor",
        "hpt": "HPT",
        "lpt": "LPT",
    }


def test_every_figure_lies_in_its_band(found: EngineAnswer) -> None:
    for row in found.coefficients:
        for name in ("egt_K", "egt_frac", "fuel_takeoff_frac", "fuel_cruise_frac"):
            assert row[f"{name}_low"] <= row[name] <= row[f"{name}_high"]


def test_a_lower_rating_runs_cooler(found: EngineAnswer) -> None:
    margins = {row["rating"]: row["model_margin_degC"] for row in found.ratings}
    assert margins["high"] == pytest.approx(60.0)
    assert margins["low"] > margins["mid"] > margins["high"] + 20.0


def test_the_hottest_ambient_is_the_trades_formula(found: EngineAnswer) -> None:
    # TRADE: OATL = T_corner + margin / k.
    by_rating = {row["rating"]: row["hottest_ambient_degC"] for row in found.ratings}
    assert by_rating["high"] == pytest.approx(30.0 + 60.0 / 3.2)


def test_margin_falls_with_ambient_and_is_the_new_margin_at_the_corner_point(found: EngineAnswer) -> None:
    line = {row["ambient_degC"]: row["margin_degC"] for row in found.ambient if row["rating"] == "mid"}
    assert line[30.0] == pytest.approx(88.0, abs=1e-6)
    assert list(line.values()) == sorted(line.values(), reverse=True)


def test_rules_are_named_and_nothing_is_inferred(found: EngineAnswer) -> None:
    assert any("no row in cycles, by rule: " in warning and "turbine entry" in warning for warning in found.warnings)
    assert NEVER_INFERRED in found.warnings


def test_cells_of_cycles_go_before_the_rules() -> None:
    rows = some_rows()
    rows["cycles"] = [{"engine_type": "N", "hpt_efficiency_frac": 0.88, "turbine_entry_K": 1600.0, "spools": 2}]
    cycle = type_cycle(rows["engine_types"][0], cycle=rows["cycles"][0], ratings=rows["ratings"])
    assert cycle.path.hpt_efficiency == 0.88
    assert cycle.path.turbine_entry_K == 1600.0
    assert {"hpt_efficiency", "turbine_entry_K"} <= cycle.given
    assert "hpt efficiency" not in cycle.warnings[0]


def test_a_rated_fuel_flow_calibrates_the_temperature() -> None:
    rows = some_rows()
    cell = {"engine_type": "N", "takeoff_fuel_kg_per_s": 1.02}
    cycle = type_cycle(rows["engine_types"][0], cycle=cell, ratings=rows["ratings"])
    from sim.cycle_design import designed

    assert designed(cycle.path).walk.fuel_flow[0] == pytest.approx(1.02, rel=1e-6)
    assert "from the take-off fuel flow" in cycle.warnings[0]


def test_a_blank_cell_may_be_not_a_number() -> None:
    rows = some_rows()
    cell = {"engine_type": "N", "turbine_entry_K": float("nan"), "exhaust": None, "egt_station": ""}
    cycle = type_cycle(rows["engine_types"][0], cycle=cell, ratings=rows["ratings"])
    assert cycle.station == "lpt_inlet"
    assert "turbine_entry_K" not in cycle.given


def test_three_spools_with_mixed_exhaust_warn() -> None:
    rows = some_rows()
    rows["cycles"] = [{"engine_type": "N", "spools": 3, "exhaust": "mixed"}]
    rows["module_types"] = [{"engine_type": "N", "module": name} for name in ("fan", "IPC", "HPC", "IPT", "LPT")]
    result = asked(rows)
    assert {"ipc", "ipt"} <= {row["component"] for row in result.coefficients}
    assert any("mixed exhaust" in warning for warning in result.warnings)


@pytest.mark.parametrize(
    ("changed", "error", "words"),
    [
        ({"bypass_ratio": None}, RequestError, "type N, bypass_ratio: found a blank cell"),
        ({"bypass_ratio": 1.0}, OutOfRangeError, "bypass ratio: found 1, expected 2 to 15"),
        ({"overall_pressure_ratio": 70.0}, OutOfRangeError, "overall pressure ratio: found 70"),
        ({"redline_degC": 560.0}, OutOfRangeError, "EGT at lpt_inlet: found 500 degC"),
    ],
)
def test_a_type_that_cannot_be_answered_is_refused(changed: dict[str, Any], error: type[Exception], words: str) -> None:
    with pytest.raises(error, match=words):
        asked(some_rows(**changed))


def test_a_fuel_flow_that_no_temperature_gives_is_refused() -> None:
    rows = some_rows()
    rows["cycles"] = [{"engine_type": "N", "takeoff_fuel_kg_per_s": 0.8}]
    with pytest.raises(NoSolutionError, match="turbine-entry temperature: no solution, none of 1350 to 1900 K"):
        asked(rows)


def test_fuel_a_degree_comes_from_the_matrix_by_module() -> None:
    share = fuel_share(models(some_rows())[0])
    lpt, hpt = share("N", "high", "LPT"), share("N", "high", "HPT")
    # DEMO: 1.6 % of cruise fuel for 10 degC lost in the LPT, 0.5 % in the core (own, grade D): the same order here.
    assert 0.0012 < lpt < 0.0028
    assert 0.0003 < hpt < 0.0006
    assert share("N", "high", "accessory gearbox") == share("N", "high", "combustor") == 0.0
    assert share("N", "none", "LPT") == 0.0


def test_one_type_that_cannot_be_computed_leaves_the_others() -> None:
    rows = some_rows()
    rows["engine_types"].append({**rows["engine_types"][0], "engine_type": "X", "bypass_ratio": None})
    rows["ratings"].append({**rows["ratings"][0], "engine_type": "X"})
    known, refused = models(rows)
    assert [one.cycle.engine_type for one in known] == ["N"]
    assert refused == [
        "not computed: type X, bypass_ratio: found a blank cell, expected a number; "
        "fill it in engine_types to have the cycle computed"
    ]
    with pytest.raises(RequestError, match="type X"):
        models(rows, engine_type="X")


def test_an_unknown_type_is_refused() -> None:
    with pytest.raises(RequestError, match="engine type: found X, expected N"):
        models(some_rows(), engine_type="X")


@pytest.mark.parametrize(
    ("module", "components"),
    [
        ("fan-booster", ("fan", "booster")),
        ("fan_booster", ("fan", "booster")),
        ("HPC", ("hpc",)),
        ("core", ("hpc", "combustor", "hpt")),
        ("accessory gearbox", ()),
        ("IPT", ()),
    ],
)
def test_a_modules_name_tells_its_components(module: str, components: tuple[str, ...]) -> None:
    assert components_of(module, spools=2) == components


# Wear in efficiency


def a_wear_row(**cells: Any) -> dict[str, Any]:
    return {"engine_type": "N", "rating": "high", "module": "HPT", **cells}


def converted(*wear: dict[str, Any]) -> tuple[list[dict[str, Any]], tuple[str, ...]]:
    rows = some_rows()
    return wear_in_degrees(wear, engine_types=rows["engine_types"], cycles=rows["cycles"], ratings=rows["ratings"])


def test_a_row_in_degrees_stays_as_it_is() -> None:
    row = a_wear_row(early_loss_degC=6.0, early_loss_eff_frac=None)
    assert converted(row) == ([row], ())


def test_a_row_in_efficiency_becomes_degrees_and_fuel_by_the_matrix() -> None:
    rows = some_rows()
    cycle = type_cycle(rows["engine_types"][0], cycle=None, ratings=rows["ratings"])
    matrix = influence(cycle.path, conditions=conditions_of(cycle, thrust_kN=108.0))
    point = matrix.of(Change("hpt", "efficiency"))
    (row,), assumed = converted(a_wear_row(early_loss_eff_frac=0.005, eff_frac_per_1000_cycles=0.002))
    assert row["early_loss_degC"] == pytest.approx(0.5 * point.egt_K.value)
    assert row["loss_degC_per_1000_cycles"] == pytest.approx(0.2 * point.egt_K.value)
    assert row["loss_degC_per_1000_hours"] == 0.0
    assert row["fuel_frac_per_degC"] == pytest.approx(point.fuel_cruise_frac.value / point.egt_K.value)
    assert assumed


def test_a_lower_rating_loses_fewer_degrees_for_the_same_point() -> None:
    high, low = converted(a_wear_row(early_loss_eff_frac=0.01), a_wear_row(rating="low", early_loss_eff_frac=0.01))[0]
    assert low["early_loss_degC"] < high["early_loss_degC"]


def test_flow_lost_with_efficiency_counts() -> None:
    plain, opened = converted(
        a_wear_row(early_loss_eff_frac=0.01), a_wear_row(early_loss_eff_frac=0.01, flow_frac_per_eff_frac=0.5)
    )[0]
    assert opened["early_loss_degC"] > plain["early_loss_degC"]


@pytest.mark.parametrize(
    ("cells", "words"),
    [
        ({"early_loss_eff_frac": 0.01, "early_loss_degC": 5.0}, "found efficiency and early_loss_degC"),
        ({"early_loss_eff_frac": 0.01, "module": "accessory gearbox"}, "a module outside the gas path"),
        ({"early_loss_eff_frac": 0.01, "module": "combustor"}, "give its wear in degC"),
    ],
)
def test_wear_that_cannot_be_converted_is_refused(cells: dict[str, Any], words: str) -> None:
    with pytest.raises(RequestError, match=words):
        converted(a_wear_row(**cells))


# What a module is worth


def a_fleet(**replaced: Any) -> Fleet:
    """Return one aircraft with one engine of two modules, and a spare LPT; figures chosen to be worked by hand."""

    def module(serial: str, name: str, *, engine: str = "", lost: float | None) -> Module:
        return Module(
            module_serial=serial,
            engine_type="N",
            module=name,
            engine_serial=engine,
            place="" if engine else "pool",
            margin_lost_degC=lost,
            cycles_since_restoration=1000,
        )

    values: dict[str, Any] = {
        "settings": Settings(as_of=dt.date(2026, 7, 1), fuel_price_usd_per_kg=0.85),
        "engine_types": (
            EngineType(
                engine_type="N",
                redline_degC=925.0,
                removal_margin_degC=5.0,
                cruise_fuel_kg_per_hour=1000.0,
                engine_change_days=1.0,
                engine_change_usd=1.0,
                spare_price_usd=1.0,
                out_of_service_usd_per_day=1.0,
            ),
        ),
        "ratings": (Rating(engine_type="N", rating="mid", thrust_kN=99.0, new_margin_degC=88.0),),
        "module_types": tuple(
            ModuleType(
                engine_type="N",
                module=name,
                exchange_place="shop",
                spare_price_usd=1.0,
                repair_days_median=1.0,
                repair_days_p90=2.0,
            )
            for name in ("HPT", "LPT")
        ),
        "wear": tuple(
            WearRow(
                engine_type="N",
                rating="mid",
                module=name,
                loss_degC_per_1000_cycles=2.0,
                unrecoverable_degC=4.0,
                fuel_frac_per_degC=share,
            )
            for name, share in (("HPT", 0.0005), ("LPT", 0.0016))
        ),
        "hazards": (),
        "work": (
            Work(
                engine_type="N",
                module="HPT",
                level="restoration",
                cost_usd=1_500_000.0,
                restores_frac=0.9,
                access_usd=70_000.0,
            ),
            Work(engine_type="N", module="HPT", level="check", cost_usd=140_000.0),
        ),
        "visits": (),
        "part_types": (),
        "part_limits": (),
        "shops": (),
        "shop_work": (),
        "bases": (Base(base="Home", environment=1.5),),
        "aircraft": (
            Aircraft(
                tail="T1",
                engine_type="N",
                rating="mid",
                base="Home",
                hours_per_year=3000.0,
                cycles_per_year=1500.0,
                average_derate_frac=0.08,
            ),
        ),
        "engines": (
            Engine(engine_serial="E1", engine_type="N", place="wing", tail="T1", position=1),
            Engine(engine_serial="E2", engine_type="N", place="spare"),
        ),
        "modules": (
            module("HPT-1", "HPT", engine="E1", lost=24.0),
            module("LPT-1", "LPT", engine="E1", lost=10.0),
            module("LPT-9", "LPT", lost=3.0),
        ),
        "parts": (),
        "strategies": (),
    }
    return Fleet(**{**values, **replaced})


def test_a_restorations_worth_is_worked_by_hand() -> None:
    # Lost 24, of them 4 for ever: 0.9 x 20 = 18 degC back for 1.57 M USD; fuel 18 x 0.0005 x 1,000 kg/h x 3,000 h.
    (row,) = restorations(a_fleet())
    assert (row.engine_type, row.module, row.level, row.flying) == ("N", "HPT", "restoration", 1)
    assert row.regained_degC == pytest.approx(18.0)
    assert row.usd_per_degC == pytest.approx(1_570_000.0 / 18.0)
    assert row.fuel_kg_per_year == pytest.approx(27_000.0)
    assert row.fuel_usd_per_year == pytest.approx(22_950.0)


def test_a_blank_loss_follows_the_formula() -> None:
    # Environment 1.5, 2 degC a thousand cycles, 1,000 cycles: 3 degC, and 4 that never came back.
    fleet = a_fleet()
    blank = Module(
        module_serial="HPT-1", engine_type="N", module="HPT", engine_serial="E1", cycles_since_restoration=1000
    )
    (one,) = conditions(a_fleet(modules=(blank,)))
    assert one.lost_degC == pytest.approx(7.0)
    assert one.stays_degC == pytest.approx(4.0)
    assert len(conditions(fleet)) == 2


def test_a_spare_lpt_on_an_engine_is_worked_by_hand() -> None:
    # Margin 88 - 24 - 10 = 54; the spare gives back 7 degC; fuel 7 x 0.0016 x 1,000 x 3,000 = 33,600 kg.
    row = spare_on_engine(a_fleet(), engine_serial="E1", module_serial="LPT-9")
    assert (row.module_off, row.module_on, row.tail) == ("LPT-1", "LPT-9", "T1")
    assert row.margin_before_degC == pytest.approx(54.0)
    assert row.margin_after_degC == pytest.approx(61.0)
    assert row.fuel_kg_per_year == pytest.approx(33_600.0)
    assert row.fuel_usd_per_year == pytest.approx(33_600.0 * 0.85)


def test_fuel_comes_from_the_matrix_where_the_table_has_none() -> None:
    bare = tuple(
        WearRow(engine_type="N", rating="mid", module=name, loss_degC_per_1000_cycles=2.0) for name in ("HPT", "LPT")
    )
    row = spare_on_engine(a_fleet(wear=bare), engine_serial="E1", module_serial="LPT-9", fuel=lambda *_: 0.002)
    assert row.fuel_kg_per_year == pytest.approx(7.0 * 0.002 * 1000.0 * 3000.0)


@pytest.mark.parametrize(
    ("engine", "module", "words"),
    [
        ("E9", "LPT-9", "engine serial: found E9"),
        ("E1", "LPT-7", "module serial: found LPT-7"),
        ("E2", "LPT-9", "an engine on an aircraft"),
        ("E1", "LPT-1", "no other LPT"),
    ],
)
def test_an_exchange_that_cannot_be_asked_is_refused(engine: str, module: str, words: str) -> None:
    with pytest.raises(RequestError, match=words):
        spare_on_engine(a_fleet(), engine_serial=engine, module_serial=module)
