"""Fitted tables in the fleet's own form: whole, used by the simulation as they are, never over the user's."""

from __future__ import annotations

import csv
import json
import shutil
from pathlib import Path

import pytest
from click.testing import CliRunner, Result

from planner.assemble import load
from planner.checks.rules import check
from planner.cli import frame
from planner.demo.make import fleet_tables
from planner.demo.write import write_tables
from planner.fit import FitAnswer, ask, write
from planner.fit_write import wear_factors
from planner.tables import open_sheets
from planner.workbook import write_workbook
from sim.errors import RequestError
from sim.spec import setup


@pytest.fixture(scope="module")
def fleet(tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("fleet")
    write_tables(folder, fleet_tables(aircraft=16, seed=3, plain=True))
    return folder


@pytest.fixture(scope="module")
def found(fleet: Path) -> FitAnswer:
    return ask(fleet)


def rows_of(path: Path) -> list[dict[str, str]]:
    with path.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


def test_the_fleet_takes_the_fitted_tables_as_they_are(fleet: Path, found: FitAnswer, tmp_path: Path) -> None:
    files = write(found, tmp_path / "fitted", fleet=fleet)
    assert [path.name for path in files] == ["hazards.csv", "wear.csv"]
    copy = tmp_path / "copy"
    shutil.copytree(fleet, copy)
    for path in files:
        shutil.copy(path, copy / path.name)
    assert [problem for problem in check(copy)[1] if problem.severity == "stops"] == []
    before, after = load(fleet), load(copy)
    fits = {(r["engine_type"], r["module"], r["cause"], r["run"]): r for r in found.tables["hazards"]}
    changed = 0
    for old, new in zip(before.hazards, after.hazards, strict=True):
        fit = fits.get((old.engine_type, old.module, old.cause, old.run))
        if fit is None or fit["scale"] is None:
            assert (new.shape, new.scale) == (old.shape, old.scale)
        else:
            changed += 1
            assert new.shape == pytest.approx(fit["shape"], rel=1e-6)
            assert new.scale == pytest.approx(fit["scale"], rel=1e-6)
            assert (new.clock, new.counted_from, new.least_level) == (old.clock, old.counted_from, old.least_level)
    assert changed > 5
    factors = {(r["engine_type"], r["rating"]): wear_factors(r) for r in found.tables["margin_types"]}
    for old_wear, new_wear in zip(before.wear, after.wear, strict=True):
        steady, early = factors.get((old_wear.engine_type, old_wear.rating), (1.0, 1.0))
        wanted = pytest.approx(steady * old_wear.loss_degC_per_1000_cycles, rel=1e-6)
        assert new_wear.loss_degC_per_1000_cycles == wanted
        assert new_wear.early_loss_degC == pytest.approx(early * old_wear.early_loss_degC, rel=1e-6)
        assert new_wear.unrecoverable_degC == old_wear.unrecoverable_degC
    setup(after, after.strategies[0].strategy, horizon_days=365.0)


def test_the_users_tables_are_never_written_over(fleet: Path, found: FitAnswer, tmp_path: Path) -> None:
    before = {path.name: path.read_bytes() for path in fleet.iterdir()}
    with pytest.raises(RequestError, match="another folder than the fleet's"):
        write(found, fleet, fleet=fleet)
    link = tmp_path / "link"
    link.symlink_to(fleet)
    with pytest.raises(RequestError, match="another folder than the fleet's"):
        write(found, link, fleet=fleet)
    assert {path.name: path.read_bytes() for path in fleet.iterdir()} == before
    other = tmp_path / "other"
    other.mkdir()
    (other / "wear.csv").write_text("mine\n", encoding="utf-8")
    with pytest.raises(RequestError, match=r"with wear\.csv"):
        write(found, other, fleet=fleet)
    assert [path.name for path in other.iterdir()] == ["wear.csv"]
    assert (other / "wear.csv").read_text(encoding="utf-8") == "mine\n"


def test_a_folder_that_cannot_be_written_is_one_clear_error(fleet: Path, found: FitAnswer, tmp_path: Path) -> None:
    (tmp_path / "file").write_text("", encoding="utf-8")
    with pytest.raises(RequestError, match="a folder that can be written"):
        write(found, tmp_path / "file" / "inside", fleet=fleet)


def test_factors_are_ratios_to_the_table_and_never_negative() -> None:
    row = {
        "rate_degC_per_1000_cycles": 5.0,
        "table_rate_degC_per_1000_cycles": 4.0,
        "early_loss_degC": -1.0,
        "table_early_loss_degC": 10.0,
    }
    assert wear_factors(row) == (1.25, 0.0)
    assert wear_factors(row | {"table_rate_degC_per_1000_cycles": 0.0})[0] == 1.0


def run(*arguments: str) -> Result:
    return CliRunner().invoke(frame, ["fit", *arguments])


def test_the_command_prints_sentences_tables_and_the_caution(fleet: Path) -> None:
    result = run(str(fleet))
    assert result.exit_code == 0
    for words in ("lost per 1,000 cycles", "Margins now", "Chance causes", "Planning aid only", "defer no inspection"):
        assert words in result.stdout


def test_one_object_for_machines(fleet: Path, tmp_path: Path) -> None:
    result = run(str(fleet), "--json", "--write", str(tmp_path / "new"))
    assert result.exit_code == 0
    body = json.loads(result.stdout)
    assert body["command"] == "fit"
    assert body["inputs"] == ask(fleet).inputs
    assert {"engine_type", "module", "cause", "shape", "scale", "failures", "censored"} <= set(
        body["result"]["hazards"][0]
    )
    assert {"engine_serial", "margin_degC", "rate_degC_per_1000_cycles", "low", "high"} <= set(
        body["result"]["margins"][0]
    )
    assert "ahead" not in body["result"]
    assert [Path(path).name for path in body["result"]["written"]] == ["hazards.csv", "wear.csv"]
    assert len(rows_of(tmp_path / "new" / "hazards.csv")) == len(rows_of(fleet / "hazards.csv"))


def test_one_engine_comes_with_its_readings_and_its_margin_ahead(fleet: Path) -> None:
    serial = ask(fleet).tables["margins"][0]["engine_serial"]
    body = json.loads(run(str(fleet), "--engine", serial, "--json").stdout)
    assert {row["engine_serial"] for row in body["result"]["ahead"]} == {serial}
    assert any(row["reading_degC"] is None for row in body["result"]["ahead"])
    assert "the margin ahead" in run(str(fleet), "--engine", serial).stdout


@pytest.mark.parametrize("wrong", [["--engine", "NOBODY"], ["--write", "."]])
def test_faults_of_the_request_are_user_errors(fleet: Path, wrong: list[str], monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(fleet)
    result = run(str(fleet), *wrong)
    assert isinstance(result.exception, RequestError)


def test_a_workbook_gives_the_same_answer_as_its_folder(fleet: Path, found: FitAnswer, tmp_path: Path) -> None:
    book = tmp_path / "fleet.xlsx"
    write_workbook(book, open_sheets(fleet).sheets)
    assert ask(book).tables == found.tables
    with pytest.raises(RequestError, match="another folder than the fleet's"):
        write(ask(book), tmp_path, fleet=book)
