"""What a fingerprint sees and what it does not see."""

from __future__ import annotations

import subprocess
import sys
from dataclasses import dataclass
from datetime import date
from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest

from planner import fingerprint
from planner.identity import Identity, identity, probe
from sim.errors import Problem


@dataclass(frozen=True, slots=True, kw_only=True)
class Engine:
    serial: str
    cycles: int
    lives: tuple[float, ...] = ()


_DIFFERENT = (
    None,
    True,
    1,
    1.0,
    "1",
    b"1",
    0.0,
    -0.0,
    Fraction(1, 3),
    date(2026, 7, 1),
    (1, 2),
    ((1,), 2),
    (1, (2,)),
    {"a": 1},
    {"a": 1, "b": 2},
    frozenset({1, 2}),
    np.arange(3),
    np.arange(3.0),
    np.zeros((2, 3)),
    np.zeros((3, 2)),
    Engine(serial="E1", cycles=3),
    Engine(serial="E1", cycles=4),
    Engine(serial="E1", cycles=3, lives=(1.0,)),
    Problem("a", "b", None, "c", "stops", "r", "f", "e", "m"),
)


def test_different_contents_have_different_fingerprints() -> None:
    assert len({fingerprint.of(value) for value in _DIFFERENT}) == len(_DIFFERENT)
    assert fingerprint.of("ab", "c") != fingerprint.of("a", "bc")


def test_the_order_of_a_mapping_or_set_does_not_count_and_that_of_a_list_does() -> None:
    assert fingerprint.of({"a": 1, "b": 2}) == fingerprint.of({"b": 2, "a": 1})
    assert fingerprint.of({3, 1, 2}) == fingerprint.of({2, 3, 1})
    assert fingerprint.of([1, 2]) != fingerprint.of([2, 1])


def test_a_fingerprint_is_the_same_in_every_process() -> None:
    code = "from planner import fingerprint; print(fingerprint.of({'b', 'a'}, {'x': 1.5}))"
    seen = {subprocess.check_output([sys.executable, "-c", code], text=True).strip() for _ in range(2)}
    assert seen == {fingerprint.of({"a", "b"}, {"x": 1.5})}


def test_a_value_without_content_is_refused() -> None:
    with pytest.raises(TypeError, match="a function has no content"):
        fingerprint.of(lambda: 0)
    with pytest.raises(TypeError, match="an array of object"):
        fingerprint.of(np.array([None]))


def test_a_folder_is_named_by_its_tables_alone(tmp_path: Path) -> None:
    (tmp_path / "parts.csv").write_text("part_serial\nA1\n")
    before = fingerprint.folder(tmp_path)
    (tmp_path / "notes.txt").write_text("nothing")
    (tmp_path / "dirty").mkdir()
    (tmp_path / "dirty" / "parts.csv").write_text("part_serial\nB1\n")
    assert fingerprint.folder(tmp_path) == before
    (tmp_path / "parts.csv").write_text("part_serial\nA2\n")
    assert fingerprint.folder(tmp_path) != before


def test_an_unlike_process_is_told_apart_in_words() -> None:
    here = identity()
    assert here.differs_from(identity()) == ""
    assert here.differs_from(here._replace(host="elsewhere", process=1)) == ""
    assert here._replace(version="0.0").differs_from(here).startswith("it runs version 0.0, the study runs")
    assert here._replace(sources="f" * 64).differs_from(here).startswith("its sources (ffffffff)")
    assert here._replace(probe="f" * 64).differs_from(here).startswith("its arithmetic (ffffffff)")


def test_the_probe_is_a_hash_that_stays() -> None:
    assert len(probe()) == 64
    assert isinstance(identity(), Identity)
    assert identity().probe == probe()
