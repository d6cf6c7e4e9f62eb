"""One mixed-integer linear problem, put together row by row and solved by HiGHS: the least cost and its proof."""

from __future__ import annotations

from collections.abc import Iterable
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray
from scipy.optimize import Bounds, LinearConstraint, milp
from scipy.sparse import csr_array

_INFEASIBLE, _STOPPED = 2, 1  # status codes of scipy.optimize.milp


class Rows:
    """Linear constraints ``low <= row · x <= high``, written one at a time."""

    def __init__(self) -> None:
        self._row: list[int] = []
        self._column: list[int] = []
        self._value: list[float] = []
        self.low: list[float] = []
        self.high: list[float] = []

    def __len__(self) -> int:
        return len(self.low)

    def add(
        self, columns: Iterable[int], values: Iterable[float] | float, *, low: float = -np.inf, high: float = np.inf
    ) -> int:
        """Write one row and return its number; one value stands for all columns, equal columns add up."""
        where = list(columns)
        what = [float(values)] * len(where) if isinstance(values, (int, float)) else list(values)
        self._row += [len(self.low)] * len(where)
        self._column += where
        self._value += what
        self.low.append(low)
        self.high.append(high)
        return len(self.low) - 1

    def matrix(self, columns: int) -> csr_array:
        return csr_array((self._value, (self._row, self._column)), shape=(len(self.low), columns))


class Minimum(NamedTuple):
    """The least cost found: ``x`` is None when there is no solution, or none was found in time (``infeasible`` tells).

    ``bound`` is what the solver proved that no solution can undercut.
    """

    x: NDArray[np.float64] | None
    cost: float
    bound: float
    infeasible: bool

    @property
    def proven(self) -> bool:
        return self.x is not None and self.cost - self.bound <= 1e-6 * max(1.0, abs(self.cost))


def minimise(
    cost: NDArray[np.float64],
    rows: Rows,
    *,
    whole: NDArray[np.bool_] | None = None,
    high: NDArray[np.float64] | float = 1.0,
    limit_s: float = 60.0,
) -> Minimum:
    """Return the least ``cost · x`` under the rows and ``0 <= x <= high``; no ``whole`` columns means the relaxation.

    The search is deterministic for equal input; the time limit is the only thing that a slower machine can change, and
    then ``bound`` says so.
    """
    columns = cost.size
    found = milp(
        cost,
        constraints=[LinearConstraint(rows.matrix(columns), rows.low, rows.high)] if len(rows) else [],
        integrality=np.zeros(columns, dtype=np.int64) if whole is None else whole.astype(np.int64),
        bounds=Bounds(np.zeros(columns), np.broadcast_to(np.asarray(high, dtype=np.float64), (columns,))),
        options={"time_limit": limit_s, "mip_rel_gap": 0.0},
    )
    bound = found.mip_dual_bound
    if found.x is None:
        return Minimum(None, np.inf, -np.inf if bound is None else float(bound), found.status == _INFEASIBLE)
    value = float(found.fun)
    if bound is None:
        bound = -np.inf if found.status == _STOPPED else value
    return Minimum(np.asarray(found.x, dtype=np.float64), value, min(float(bound), value), False)
