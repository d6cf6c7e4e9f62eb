"""``spoolwright engine`` on a small folder: what is printed, the JSON object, and what is refused."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest
import small_tables

from planner.assemble import load
from planner.cli import main
from planner.schema.registry import OUTPUTS


def a_folder(tmp_path: Path, **changed: Any) -> Path:
    """Write the small fleet with bypass and pressure ratio; ``changed`` replaces tables."""
    tables = small_tables.small_tables()
    tables["engine_types"][0] |= {"bypass_ratio": "6.2", "overall_pressure_ratio": "34"}
    return small_tables.write(tmp_path / "fleet", {**tables, **changed})


def run(*arguments: str) -> int:
    with pytest.raises(SystemExit) as ended:
        main(["engine", *arguments])
    return int(ended.value.code or 0)


def test_the_object_holds_the_tables_of_the_contract(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run(str(a_folder(tmp_path)), "--type", "N", "--json") == 0
    body = json.loads(capsys.readouterr().out)
    assert body["command"] == "engine"
    assert body["inputs"]
    assert any("no row in cycles" in warning for warning in body["warnings"])
    result = body["result"]
    for name, table in (("stations", "stations"), ("coefficients", "coefficients"), ("restorations", "restorations")):
        assert result[name]
        assert set(result[name][0]) == set(OUTPUTS[table].names)
    hpt = next(row for row in result["coefficients"] if row["module"] == "HPT" and row["change"] == "efficiency")
    assert hpt["egt_K_low"] < hpt["egt_K"] < hpt["egt_K_high"]


def test_the_tables_can_be_read_and_carry_the_caution(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run(str(a_folder(tmp_path))) == 0
    text = capsys.readouterr().out
    for words in ("HPT rotor inlet", "throat area", "Planning aid only", "most degrees for its price", "Assumed: "):
        assert words in text


def test_a_spare_module_on_an_engine_is_answered(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    folder = a_folder(tmp_path)
    assert run(str(folder), "--spare", "HPT-05", "--engine", "E1", "--json") == 0
    (row,) = json.loads(capsys.readouterr().out)["result"]["spare_on_engine"]
    assert (row["module_off"], row["module_on"], row["tail"]) == ("HPT-01", "HPT-05", "T-1")
    assert row["margin_after_degC"] == pytest.approx(row["margin_before_degC"] + row["gained_degC"])


@pytest.mark.parametrize(
    ("arguments", "code", "words"),
    [
        (["--type", "X"], 1, "engine type: found X, expected N"),
        (["--spare", "HPT-05", "--engine", "E9"], 1, "engine serial: found E9"),
        (["--spare", "HPT-05"], 2, "belong together"),
        (["--rating", "high"], 2, "No such option"),
    ],
)
def test_what_cannot_be_asked_ends_with_its_code(
    arguments: list[str], code: int, words: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    assert run(str(a_folder(tmp_path)), *arguments) == code
    printed = capsys.readouterr()
    assert words in printed.err
    assert printed.out == ""


def test_a_missing_folder_is_told(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run(str(tmp_path / "none")) == 1
    assert "nothing there" in capsys.readouterr().err


def test_a_type_without_bypass_ratio_is_told_what_to_fill(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    folder = small_tables.write(tmp_path / "fleet", small_tables.small_tables())
    assert run(str(folder)) == 1
    assert "type N, bypass_ratio: found a blank cell" in capsys.readouterr().err


def test_wear_in_efficiency_becomes_the_fleets_degrees(tmp_path: Path) -> None:
    wear = [
        {
            "engine_type": "N",
            "rating": rating,
            "module": module,
            "early_loss_degC": "1" if module == "fan" else "",
            "early_loss_eff_frac": "0.005" if module == "HPT" else "",
            "spread_frac": "0.1",
        }
        for module in ("HPT", "fan")
        for rating in ("high", "low")
    ]
    fleet = load(a_folder(tmp_path, wear=wear))
    high, low, fan = fleet.wear[0], fleet.wear[1], fleet.wear[2]
    assert 5.0 < high.early_loss_degC < 9.0
    assert low.early_loss_degC < high.early_loss_degC
    assert high.fuel_frac_per_degC > 0.0
    assert high.spread_frac == 0.1
    assert fan.early_loss_degC == 1.0
    assert any("no row in cycles" in sentence for sentence in fleet.assumptions)
