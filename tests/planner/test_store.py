"""Saved studies: whole or not there, whoever writes at once, is killed, or fills the disk."""

from __future__ import annotations

import os
import random
import subprocess
import sys
import time
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import numpy as np
import odd_jobs
import odd_saver
import pyarrow as pa
import pytest

from planner import store
from planner.errors import SavedRunsError
from planner.home import home
from planner.rows import pack

SAVER = Path(__file__).parent / "jobs" / "odd_saver.py"


def _packed(rows: dict) -> dict:
    return {task: pack(row) for task, row in rows.items()}


def test_a_study_comes_back_to_the_last_bit(tmp_path: Path) -> None:
    name = odd_saver.save(tmp_path, 1)
    saved = store.load(tmp_path, name)
    assert saved.manifest == odd_saver.manifest(1)
    assert _packed(saved.rows(odd_jobs.OddRow)) == _packed(odd_saver.rows(1))
    assert list(saved.rows(odd_jobs.OddRow)) == list(odd_saver.rows(1))
    assert (saved.folder / "inputs" / "parts.csv").read_text() == "part_serial\nÄ1\n"
    assert saved.table("costs").to_pydict() == {"line": ["parts", "fuel"], "usd_mean": [1.5, 2.0]}
    assert saved.table("rows", columns=["removals"], filters=[("run", "==", 2)]).num_rows == 2


def test_the_name_stands_for_what_went_in_and_not_for_when(tmp_path: Path) -> None:
    plain = odd_saver.manifest(1)
    assert odd_saver.manifest(1, made_at="2027-01-01", summary={"a": 1}, probe="other").id == plain.id
    others = [
        odd_saver.manifest(2),
        odd_saver.manifest(1, inputs="j" * 64),
        odd_saver.manifest(1, strategies=("exchange", "whole_engine")),
        odd_saver.manifest(1, settings={"precision_frac": 0.02, "horizon_years": 10}),
        odd_saver.manifest(1, version="0.2.0"),
        odd_saver.manifest(1, runs=2, finished=False),
    ]
    assert len({plain.id, *(other.id for other in others)}) == 7


def test_a_name_may_be_shortened_and_a_wrong_one_lists_what_is_there(tmp_path: Path) -> None:
    with pytest.raises(SavedRunsError, match="no saved study has this name; saved are: none is saved yet"):
        store.load(tmp_path, "abc")
    names = [odd_saver.save(tmp_path, seed) for seed in range(3)]
    assert store.load(tmp_path, names[1][:8]).manifest.seed == 1
    with pytest.raises(SavedRunsError, match=f"no saved study has this name; saved are: .*{names[0]}"):
        store.load(tmp_path, "nothing")
    with pytest.raises(SavedRunsError, match="has no table events; it has: costs, rows"):
        store.load(tmp_path, names[0]).table("events")


def test_studies_are_listed_newest_first_and_deleted_ones_are_gone(tmp_path: Path) -> None:
    assert store.studies(tmp_path) == []
    names = [odd_saver.save(tmp_path, seed) for seed in range(4)]
    assert [manifest.seed for manifest in store.studies(tmp_path)] == [3, 2, 1, 0]
    assert store.delete(tmp_path, names[2][:10]) == names[2]
    assert [manifest.seed for manifest in store.studies(tmp_path)] == [3, 1, 0]
    with pytest.raises(SavedRunsError, match="no saved study has this name"):
        store.delete(tmp_path, names[2])


@pytest.mark.parametrize("harm", ["lost", "garbage", "empty"])
def test_the_index_is_rebuilt_from_the_folders(tmp_path: Path, harm: str) -> None:
    for seed in range(3):
        odd_saver.save(tmp_path, seed)
    index = tmp_path / "index.sqlite"
    for path in tmp_path.glob("index.sqlite-*"):
        path.unlink()
    if harm == "lost":
        index.unlink()
    else:
        index.write_bytes(b"no database at all" * 500 if harm == "garbage" else b"")
    assert [manifest.seed for manifest in store.studies(tmp_path)] == [2, 1, 0]
    assert [manifest.seed for manifest in store.studies(tmp_path)] == [2, 1, 0]


def test_a_folder_that_was_copied_in_or_taken_away_by_hand_is_noticed(tmp_path: Path) -> None:
    one, two = tmp_path / "one", tmp_path / "two"
    names = [odd_saver.save(one, seed) for seed in range(2)]
    (two / "studies").mkdir(parents=True)
    (one / "studies" / names[0]).rename(two / "studies" / names[0])
    assert [manifest.seed for manifest in store.studies(one)] == [1]
    assert [manifest.seed for manifest in store.studies(two)] == [0]


@pytest.mark.parametrize("file", ["rows.parquet", "inputs/parts.csv", "manifest.json"])
def test_a_damaged_study_is_never_read_and_says_what_is_damaged(tmp_path: Path, file: str) -> None:
    name = odd_saver.save(tmp_path, 1)
    path = tmp_path / "studies" / name / file
    content = bytearray(path.read_bytes())
    content[len(content) // 2] ^= 1
    path.write_bytes(content)
    with pytest.raises(SavedRunsError, match=r"it is damaged.*delete it and run it again"):
        store.load(tmp_path, name)
    assert store.delete(tmp_path, name) == name


def test_an_unfinished_folder_is_read_by_nobody_and_removed_when_old(tmp_path: Path) -> None:
    odd_saver.save(tmp_path, 1)
    left = tmp_path / "studies" / ".building-1-1"
    left.mkdir()
    (left / "rows.parquet").write_bytes(b"half")
    assert len(store.studies(tmp_path)) == 1
    odd_saver.save(tmp_path, 2)
    assert left.exists()
    os.utime(left, (time.time() - 2 * store.STALE_SECONDS,) * 2)
    odd_saver.save(tmp_path, 3)
    assert not left.exists()


def test_eight_writers_of_the_same_studies_and_readers_at_once_do_not_disturb_each_other(tmp_path: Path) -> None:
    def write(start: int) -> list[str]:
        return [odd_saver.save(tmp_path, seed % 6) for seed in range(start, start + 6)]

    def read(_: int) -> None:
        for manifest in store.studies(tmp_path):
            store.load(tmp_path, manifest.id).rows(odd_jobs.OddRow)

    with ThreadPoolExecutor(12) as pool:
        writers = [pool.submit(write, start) for start in range(8)]
        readers = [pool.submit(read, number) for number in range(12)]
        names = {name for writer in writers for name in writer.result()}
        for reader in readers:
            reader.result()
    assert len(names) == 6
    assert {manifest.seed for manifest in store.studies(tmp_path)} == set(range(6))
    assert not list((tmp_path / "studies").glob(".building*"))


def test_a_full_disk_leaves_nothing_and_says_so(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    odd_saver.save(tmp_path, 1)

    def full(*_: object, **__: object) -> None:
        with open("/dev/full", "wb", buffering=0) as disk:
            disk.write(b"x")

    monkeypatch.setattr(store.pq, "write_table", full)
    with pytest.raises(SavedRunsError, match="this study is not saved: No space left on device; make room"):
        odd_saver.save(tmp_path, 2)
    assert [path.name for path in (tmp_path / "studies").iterdir()] == [odd_saver.manifest(1).id]


def test_a_home_that_is_a_file_is_a_clear_error(tmp_path: Path) -> None:
    (tmp_path / "home").write_text("")
    with pytest.raises(SavedRunsError, match="this study is not saved: Not a directory"):
        odd_saver.save(tmp_path / "home", 1)


def test_many_event_rows_stay_queryable(tmp_path: Path) -> None:
    """Only the columns and the row groups that are asked for are read."""
    count = 400_000
    events = pa.table(
        {
            "run": np.repeat(np.arange(200), count // 200),
            "day": np.tile(np.linspace(0.0, 3650.0, count // 200), 200),
            "serial": pa.array(np.arange(count) % 500).cast(pa.string()).dictionary_encode(),
        }
    )
    name = store.save(tmp_path, odd_saver.manifest(1), inputs={}, rows={}, tables={"events": events})
    asked = [("serial", "==", "7"), ("run", "==", 3)]
    found = store.load(tmp_path, name).table("events", columns=["day"], filters=asked)
    assert found.num_rows == 4
    assert found.column_names == ["day"]


def _kill_savers(home_folder: Path, kills: int, luck: random.Random) -> None:
    """Kill a process that saves, again and again; each name that it had printed must be there, whole."""
    told: list[str] = []
    for kill in range(kills):
        saver = subprocess.Popen(
            [sys.executable, str(SAVER), str(home_folder), str(1000 * kill)], stdout=subprocess.PIPE, text=True
        )
        told.append(saver.stdout.readline().strip())
        time.sleep(luck.random() * 0.1)
        saver.kill()
        out, _ = saver.communicate()
        told += out.split("\n")[:-1]
        assert {manifest.id for manifest in store.studies(home_folder)} >= set(told)
    for manifest in store.studies(home_folder):
        saved = store.load(home_folder, manifest.id)
        assert _packed(saved.rows(odd_jobs.OddRow)) == _packed(odd_saver.rows(manifest.seed))
    assert len(told) >= kills


def test_killed_three_times_while_saving_nothing_told_is_lost_and_nothing_is_half(tmp_path: Path) -> None:
    _kill_savers(tmp_path, 3, random.Random(1))


@pytest.mark.long
def test_killed_a_hundred_times_while_saving_nothing_told_is_lost_and_nothing_is_half(tmp_path: Path) -> None:
    _kill_savers(tmp_path, 100, random.Random(2))


def test_the_home_is_named_by_the_environment_else_the_users_data_folder(
    monkeypatch: pytest.MonkeyPatch, tmp_path: Path
) -> None:
    monkeypatch.setenv("SPOOLWRIGHT_HOME", str(tmp_path / "mine"))
    assert home() == tmp_path / "mine"
    monkeypatch.delenv("SPOOLWRIGHT_HOME")
    monkeypatch.setattr(sys, "platform", "linux")
    monkeypatch.setenv("XDG_DATA_HOME", str(tmp_path / "data"))
    assert home() == tmp_path / "data" / "spoolwright"
