"""Rows kept as they arrive: found again, whole or not at all, whoever was stopped and however full the disk is."""

from __future__ import annotations

import os
import time
from pathlib import Path

import odd_jobs
import pytest

from planner.kept import Kept, drop_oldest
from planner.rows import pack

KEYS = {"whole_engine": "key-of-whole", "exchange": "key-of-exchange"}


def _row(run: int) -> odd_jobs.OddRow:
    return odd_jobs.steady({"name": "kept"}, "exchange", run)


def _filled(home: Path, runs: range) -> Path:
    """Keep some rows and return the one file that they went to."""
    with Kept(home, KEYS, odd_jobs.OddRow) as kept:
        for run in runs:
            kept.put(("exchange", run), _row(run))
    return max((home / "kept" / "key-of-exchange").glob("*.rows"), key=os.path.getmtime)


def test_rows_are_found_again_by_another_reader(tmp_path: Path) -> None:
    _filled(tmp_path, range(5))
    with Kept(tmp_path, KEYS, odd_jobs.OddRow) as kept:
        assert kept.count() == 5
        assert pack(kept.get(("exchange", 3))) == pack(_row(3))
        assert ("exchange", 5) not in kept
        assert kept.get(("whole_engine", 3)) is None


def test_other_content_finds_nothing(tmp_path: Path) -> None:
    _filled(tmp_path, range(5))
    with Kept(tmp_path, {**KEYS, "exchange": "another-key"}, odd_jobs.OddRow) as kept:
        assert kept.count() == 0


def test_rows_of_two_writers_at_once_are_all_found(tmp_path: Path) -> None:
    with Kept(tmp_path, KEYS, odd_jobs.OddRow) as one, Kept(tmp_path, KEYS, odd_jobs.OddRow) as two:
        for run in range(10):
            (one if run % 2 else two).put(("exchange", run), _row(run))
    with Kept(tmp_path, KEYS, odd_jobs.OddRow) as kept:
        assert kept.count() == 10


def test_a_row_is_safe_before_the_file_is_closed(tmp_path: Path) -> None:
    writer = Kept(tmp_path, KEYS, odd_jobs.OddRow)
    writer.put(("exchange", 0), _row(0))
    with Kept(tmp_path, KEYS, odd_jobs.OddRow) as reader:
        assert reader.count() == 1
    writer.close()


def test_a_file_cut_anywhere_gives_its_whole_rows_and_no_others(tmp_path: Path) -> None:
    path = _filled(tmp_path, range(4))
    content = path.read_bytes()
    counts = []
    for size in range(0, len(content) + 1, 7):
        path.write_bytes(content[:size])
        with Kept(tmp_path, KEYS, odd_jobs.OddRow) as kept:
            counts.append(kept.count())
            for run in range(kept.count()):
                assert pack(kept.get(("exchange", run))) == pack(_row(run))
    assert counts == sorted(counts)
    assert set(counts) >= {0, 1, 2, 3}


def test_a_flipped_byte_is_noticed(tmp_path: Path) -> None:
    path = _filled(tmp_path, range(4))
    content = bytearray(path.read_bytes())
    content[len(content) // 2] ^= 1
    path.write_bytes(content)
    with Kept(tmp_path, KEYS, odd_jobs.OddRow) as kept:
        assert kept.count() == 2


def test_a_full_disk_is_told_once_and_the_rows_go_on_in_memory(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """/dev/full answers every write as a full disk does."""
    real = os.open

    def opened(path: Path, *more: int) -> int:
        return real("/dev/full", os.O_WRONLY) if path.suffix == ".rows" else real(path, *more)

    monkeypatch.setattr(os, "open", opened)
    with Kept(tmp_path, KEYS, odd_jobs.OddRow) as kept:
        for run in range(3):
            kept.put(("exchange", run), _row(run))
        assert kept.trouble is not None
        assert "No space left on device" in kept.trouble
        assert pack(kept.get(("exchange", 2))) == pack(_row(2))


def test_a_home_that_cannot_be_written_is_told_and_the_rows_go_on_in_memory(tmp_path: Path) -> None:
    (tmp_path / "kept").write_text("a file where the folder should be")
    with Kept(tmp_path, KEYS, odd_jobs.OddRow) as kept:
        kept.put(("exchange", 0), _row(0))
        assert kept.trouble is not None
        assert kept.count() == 1


def test_the_keys_used_longest_ago_make_room(tmp_path: Path) -> None:
    for age, name in enumerate(("new", "old", "oldest")):
        (tmp_path / name).mkdir()
        (tmp_path / name / "1.rows").write_bytes(b"x" * 100)
        os.utime(tmp_path / name, (time.time() - age * 1000,) * 2)
    drop_oldest(tmp_path, most_bytes=250)
    assert sorted(path.name for path in tmp_path.iterdir()) == ["new", "old"]
