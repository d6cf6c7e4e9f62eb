"""Rows as bytes: nothing is lost, nothing is run, and equal rows are equal bytes."""

from __future__ import annotations

import math
from typing import NamedTuple

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra import numpy as hnp

from planner.rows import pack, unpack


class Mixed(NamedTuple):
    number: float
    count: int
    name: str
    curve: np.ndarray


class Other(NamedTuple):
    number: float


_ARRAYS = hnp.arrays(
    st.sampled_from([np.float64, np.int64, np.int32, np.bool_, np.float32]),
    hnp.array_shapes(min_dims=0, max_dims=3, min_side=0, max_side=4),
)


@given(st.floats(), st.integers(), st.text(st.characters(codec="utf-8")), _ARRAYS)
def test_a_row_comes_back_to_the_last_bit(number: float, count: int, name: str, curve: np.ndarray) -> None:
    row = Mixed(number, count, name, curve)
    back = unpack(pack(row), Mixed)
    assert back[1:3] == row[1:3]
    assert math.isnan(number) if math.isnan(back.number) else back.number == number
    assert back.curve.dtype == curve.dtype
    assert back.curve.shape == curve.shape
    assert back.curve.tobytes() == curve.tobytes()
    assert pack(back) == pack(row)


def test_one_digit_more_is_other_bytes() -> None:
    row = Mixed(1.0, 2, "a", np.zeros(3))
    assert pack(row) != pack(row._replace(number=math.nextafter(1.0, 2.0)))
    assert pack(row) != pack(row._replace(curve=np.zeros((3, 1))))
    assert pack(row) == pack(row._replace(curve=np.zeros((3, 2))[:, 0]))


def test_a_field_that_is_no_plain_value_is_refused() -> None:
    with pytest.raises(TypeError, match="field curve holds ndarray of object"):
        pack(Mixed(1.0, 2, "a", np.array([object()])))
    with pytest.raises(TypeError, match="field number holds NoneType"):
        pack(Mixed(None, 2, "a", np.zeros(1)))  # type: ignore[arg-type]


def test_bytes_of_another_kind_of_row_are_refused() -> None:
    with pytest.raises(ValueError, match="is no Mixed"):
        unpack(pack(Other(1.0)), Mixed)
    with pytest.raises(ValueError, match="bytes of values"):
        unpack(pack(Other(1.0)) + b"more", Other)
