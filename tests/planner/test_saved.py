"""Questions about saved studies, and the command that asks them."""

from __future__ import annotations

import csv
import json
import zipfile
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import odd_jobs
import odd_saver
import pytest
from click.testing import CliRunner, Result
from scipy.stats import ttest_ind

from planner import store
from planner.cli import frame
from planner.errors import SavedRunsError
from planner.identity import identity
from planner.manifest import Manifest
from planner.saved import Again, again, compare_totals, settings_that_differ
from planner.saved_export import export
from planner.sequential import paired_interval


def _study(home: Path, *, name: str = "a", seed: int = 1, runs: int = 8, **settings: object) -> store.Saved:
    """Save a study computed by this very program and return it."""
    here = identity()
    manifest = Manifest(
        command="compare",
        version=here.version,
        sources=here.sources,
        probe=here.probe,
        inputs="i" * 64,
        seed=seed,
        strategies=("whole_engine", "exchange"),
        settings={"name": name, "horizon_years": 10, **settings},
        runs=runs,
        made_at="2026-07-01T08:00:00+00:00",
        summary={"strategies": [{"strategy": "exchange", "runs": runs, "total_usd_mean": 1234.5}]},
    )
    tasks = [(strategy, run) for run in range(runs) for strategy in manifest.strategies]
    inputs = {"parts.csv": f"part_serial\n{name}\n".encode()}
    rows = dict(_recompute(Path(), {"name": name}, tasks))
    return store.load(home, store.save(home, manifest, inputs=inputs, rows=rows))


def _recompute(inputs: Path, settings: dict[str, Any], tasks: list) -> Iterator[tuple]:
    for task in tasks:
        yield task, odd_jobs.steady({"name": settings["name"]}, *task)


def test_a_study_comes_again_to_the_last_digit(tmp_path: Path) -> None:
    assert again(_study(tmp_path), recompute=_recompute) == Again(True, 16, "", "")


def test_one_digit_that_does_not_come_again_is_found_and_named(tmp_path: Path) -> None:
    def almost(inputs: Path, settings: dict[str, Any], tasks: list) -> Iterator[tuple]:
        for task, row in _recompute(inputs, settings, tasks):
            nudged = row.total_usd * (1.0 + 2.0**-52) if task == ("exchange", 3) else row.total_usd
            yield task, row._replace(total_usd=nudged)

    assert again(_study(tmp_path), recompute=almost) == Again(False, 7, "strategy exchange, run 3", "")


def test_rows_that_do_not_come_again_are_missed(tmp_path: Path) -> None:
    found = again(_study(tmp_path), recompute=lambda *asked: list(_recompute(*asked))[:-1])
    assert found == Again(False, 15, "only 15 of 16 rows came again", "")


def test_other_sources_are_told(tmp_path: Path) -> None:
    odd_saver.save(tmp_path, 1)
    saved = store.load(tmp_path, odd_saver.manifest(1).id)
    found = again(saved, recompute=lambda inputs, settings, tasks: odd_saver.rows(1).items())
    assert found.same
    assert "from other sources than these" in found.note


def test_studies_under_the_same_seed_are_compared_run_by_run(tmp_path: Path) -> None:
    one, other = _study(tmp_path, name="a"), _study(tmp_path, name="b", runs=6)
    line = compare_totals(one, other)[1]
    a = [odd_jobs.steady({"name": "a"}, "exchange", run).total_usd for run in range(6)]
    b = [odd_jobs.steady({"name": "b"}, "exchange", run).total_usd for run in range(6)]
    wanted = paired_interval(a, b)
    assert (line.strategy, line.same_luck) == ("exchange", "yes")
    assert (line.total_usd_mean, line.total_usd_low, line.total_usd_high) == (wanted.mean, wanted.low, wanted.high)


def test_studies_under_other_seeds_are_compared_as_independent_samples(tmp_path: Path) -> None:
    """The interval is that of scipy's test for two samples of unlike variance."""
    one, other = _study(tmp_path, name="a"), _study(tmp_path, name="b", seed=2, runs=6)
    line = compare_totals(one, other)[0]
    a = [odd_jobs.steady({"name": "a"}, "whole_engine", run).total_usd for run in range(8)]
    b = [odd_jobs.steady({"name": "b"}, "whole_engine", run).total_usd for run in range(6)]
    wanted = ttest_ind(a, b, equal_var=False).confidence_interval(0.95)
    assert line.same_luck == "no"
    assert (line.total_usd_low, line.total_usd_high) == pytest.approx((wanted.low, wanted.high), rel=1e-12)


def test_what_differs_between_two_studies_is_listed(tmp_path: Path) -> None:
    one, other = _study(tmp_path, name="a"), _study(tmp_path, name="b", seed=2, fuel=0.9)
    found = {setting.what: (setting.first, setting.second) for setting in settings_that_differ(one, other)}
    assert found["seed"] == ("1", "2")
    assert found["name"] == ("a", "b")
    assert found["fuel"] == ("not there", "0.9")
    assert set(found) == {"seed", "name", "fuel", "table parts.csv"}
    assert settings_that_differ(one, one) == []


def test_an_export_holds_the_tables_as_csv_and_is_the_same_each_time(tmp_path: Path) -> None:
    saved = _study(tmp_path)
    export(saved, tmp_path / "out.zip")
    export(saved, tmp_path / "out2.zip")
    assert (tmp_path / "out.zip").read_bytes() == (tmp_path / "out2.zip").read_bytes()
    with zipfile.ZipFile(tmp_path / "out.zip") as archive:
        names = archive.namelist()
        rows = list(csv.DictReader(archive.read("rows.csv").decode().splitlines()))
    assert set(names) == {"manifest.json", "inputs/parts.csv", "rows.parquet", "rows.csv"}
    assert float(rows[3]["total_usd"]) == odd_jobs.steady({"name": "a"}, "exchange", 1).total_usd
    folder = export(saved, tmp_path / "folder")
    assert {path.name for path in folder.iterdir()} == {"manifest.json", "inputs", "rows.parquet", "rows.csv"}
    with pytest.raises(SavedRunsError, match="exists already; name a file or folder that does not"):
        export(saved, tmp_path / "folder")


def test_exported_text_that_begins_like_a_formula_is_made_harmless(tmp_path: Path) -> None:
    rows = {("=1+1", 0): odd_jobs.steady({"name": "x"}, "=1+1", 0)}
    name = store.save(tmp_path, odd_saver.manifest(1, strategies=("=1+1",)), inputs={}, rows=rows)
    export(store.load(tmp_path, name), tmp_path / "out")
    assert "\n'=1+1,0," in (tmp_path / "out" / "rows.csv").read_text().replace("\r\n", "\n")


def _run(home: Path, *arguments: str) -> Result:
    return CliRunner().invoke(frame, ["runs", *arguments], env={"SPOOLWRIGHT_HOME": str(home)})


def test_the_command_lists_shows_compares_exports_and_deletes(tmp_path: Path) -> None:
    assert "no study is saved" in _run(tmp_path, "list").output
    one, other = _study(tmp_path, name="a").manifest.id, _study(tmp_path, name="b").manifest.id
    assert _run(tmp_path, "list").output.count("compare") == 2
    shown = _run(tmp_path, "show", one[:6])
    assert shown.exit_code == 0, shown.output
    assert "horizon_years: 10" in shown.output
    assert "1,234" in shown.output
    compared = _run(tmp_path, "compare", one, other)
    assert "parts.csv" in compared.output
    assert "whole_engine" in compared.output
    assert _run(tmp_path, "export", one, str(tmp_path / "out")).exit_code == 0
    assert _run(tmp_path, "delete", one, other).output == f"deleted {one}\ndeleted {other}\n"
    assert "no study is saved" in _run(tmp_path, "list").output


def test_the_command_answers_machines_with_one_object(tmp_path: Path) -> None:
    study = _study(tmp_path).manifest
    listed = json.loads(_run(tmp_path, "list", "--json").output)
    assert listed["command"] == "runs"
    assert listed["result"]["studies"][0]["study"] == study.id
    shown = json.loads(_run(tmp_path, "show", study.id, "--json").output)
    assert (shown["inputs"], shown["seed"]) == (study.inputs, study.seed)
    assert shown["result"]["settings"] == study.settings
    compared = json.loads(_run(tmp_path, "compare", study.id, study.id, "--json").output)
    assert compared["result"]["settings"] == []
    assert compared["result"]["totals"][0]["total_usd_mean"] == 0.0


@pytest.mark.parametrize("arguments", [("show", "nothing"), ("delete", "nothing"), ("compare", "a", "b")])
def test_an_unknown_study_is_the_users_error(tmp_path: Path, arguments: tuple[str, ...]) -> None:
    with pytest.raises(SavedRunsError, match="no saved study has this name"):
        CliRunner().invoke(frame, ["runs", *arguments], env={"SPOOLWRIGHT_HOME": str(tmp_path)}, catch_exceptions=False)
