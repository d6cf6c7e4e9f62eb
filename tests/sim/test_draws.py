"""Draws by name: the generator's published answers, and that names alone decide."""

from __future__ import annotations

import numpy as np
import pytest

from sim.draws import Luck, entity, normal, one_uniform, philox, uniforms


@pytest.mark.parametrize(
    ("counter", "key", "answer"),
    [
        ([0, 0, 0, 0], (0, 0), [0x6627E8D5, 0xE169C58D, 0xBC57AC4C, 0x9B00DBD8]),
        ([0xFFFFFFFF] * 4, (0xFFFFFFFF, 0xFFFFFFFF), [0x408F276D, 0x41C83B0E, 0xA20BC7C6, 0x6D5451FD]),
        (
            [0x243F6A88, 0x85A308D3, 0x13198A2E, 0x03707344],
            (0xA4093822, 0x299F31D0),
            [0xD16CFE09, 0x94FDCCEB, 0x5001E420, 0x24126EA1],
        ),
    ],
)
def test_philox_gives_the_known_answers(counter: list[int], key: tuple[int, int], answer: list[int]) -> None:
    # known-answer vectors of philox4x32-10, published with the Random123 library (Salmon et al., SC 2011)
    out = philox(np.array(counter, dtype=np.uint64).reshape(4, 1), key)
    assert out[:, 0].tolist() == answer


def test_uniforms_are_even_and_never_reach_the_ends() -> None:
    values = uniforms(np.arange(50_000, dtype=np.uint64), seed=3, run=1, purpose="wear").ravel()
    assert 0.0 < values.min() < values.max() < 1.0
    assert values.mean() == pytest.approx(0.5, abs=4 / np.sqrt(12 * values.size))
    counts, _ = np.histogram(values, bins=20, range=(0, 1))
    chi_squared = ((counts - values.size / 20) ** 2 / (values.size / 20)).sum()
    assert chi_squared < 43.8  # 0.999 quantile of chi-squared with 19 degrees of freedom


def test_an_added_entity_shifts_nobodys_numbers() -> None:
    few = np.array([entity("module", s) for s in ("M1", "M2")], dtype=np.uint64)
    more = np.array([entity("module", s) for s in ("M0", "M1", "M2")], dtype=np.uint64)
    a = Luck(few, ("wear", "turn"), seed=5, run=7)
    b = Luck(more, ("wear", "turn"), seed=5, run=7)
    assert [a.draw("wear", 0, n) for n in range(40)] == [b.draw("wear", 1, n) for n in range(40)]


def test_a_draw_does_not_depend_on_when_it_is_asked_for() -> None:
    names = np.array([entity("engine", "E1")], dtype=np.uint64)
    early, late = Luck(names, ("turn",), seed=1, run=0), Luck(names, ("turn",), seed=1, run=0)
    first = late.draw("turn", 0, 100)
    assert [early.draw("turn", 0, n) for n in range(101)][-1] == first
    assert one_uniform(entity("engine", "E1"), seed=1, run=0, purpose="turn", number=100) == first


def test_seed_run_and_purpose_each_change_the_draw() -> None:
    name = entity("engine", "E1")
    base = one_uniform(name, seed=1, run=0, purpose="turn", number=0)
    others = [
        one_uniform(name, seed=2, run=0, purpose="turn", number=0),
        one_uniform(name, seed=1, run=1, purpose="turn", number=0),
        one_uniform(name, seed=1, run=0, purpose="wear", number=0),
        one_uniform(name, seed=1, run=0, purpose="turn", number=1),
    ]
    assert len({base, *others}) == 5


def test_normal_inverts_the_distribution() -> None:
    assert normal(0.5) == 0.0
    assert normal(0.9) == pytest.approx(1.2815515655446004, abs=1e-12)
