"""Any plain fleet that the generator makes passes every rule."""

from __future__ import annotations

from pathlib import Path

import pytest

from planner.checks.rules import check
from planner.demo.make import make


def problems_of(folder: Path, *, aircraft: int, seed: int) -> list[str]:
    make(folder, aircraft=aircraft, seed=seed, plain=True)
    return [problem.sentence() for problem in check(folder)[1]]


@pytest.mark.parametrize("seed", range(3, 9))
def test_small_plain_fleets_have_no_problem(tmp_path: Path, seed: int) -> None:
    assert problems_of(tmp_path / "fleet", aircraft=1 + seed % 5, seed=seed) == []


@pytest.mark.long
def test_sixty_plain_fleets_have_no_problem(tmp_path: Path) -> None:
    found = {
        (aircraft, seed): problems_of(tmp_path / f"{aircraft}-{seed}", aircraft=aircraft, seed=seed)
        for seed in range(100, 120)
        for aircraft in (2, 12, 40)
    }
    assert {key: told for key, told in found.items() if told} == {}
