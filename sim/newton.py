"""Newton's rule for a stack of small systems of equations at once, with halved steps.

Each of n systems has k unknowns; slopes are differences, taken for all unknowns of all systems in one evaluation, since
an evaluation of the cycle costs hardly more for many engines than for one.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from sim.gas import Values

DIFFERENCE = 1e-6
_MOST_STEPS = 40
_LONGEST = 0.2
_SHORTEST = 1e-4


def newton(misfit: Callable[[Values], Values], start: Values, *, tolerance: float) -> Values:
    """Return the unknowns, shape (k, n), after Newton's rule from ``start``; the caller checks the residual.

    ``misfit`` maps unknowns of shape (k, (k + 1) n), the stack laid k + 1 times one behind the other, to residuals of
    the same shape; unknowns and residuals should be relative. A system whose largest residual does not fall (or is
    not a number) halves its step; where nothing helps it stays at the best point found, and a
    system without a residual at its start is left alone.
    """
    unknowns, count = start.shape

    def around(place: Values) -> tuple[Values, Values]:
        """Return residuals (k, n) and slopes (n, k, k)."""
        shifted = np.tile(place, unknowns + 1).reshape(unknowns, unknowns + 1, count)
        for k in range(unknowns):
            shifted[k, k + 1] += DIFFERENCE
        every = misfit(shifted.reshape(unknowns, -1)).reshape(unknowns, unknowns + 1, count)
        return every[:, 0], np.moveaxis((every[:, 1:] - every[:, :1]) / DIFFERENCE, 2, 0)

    best = start
    residual, slopes = around(best)
    size = np.max(np.abs(residual), axis=0)
    share = np.ones_like(size)
    for _ in range(_MOST_STEPS):
        open_ones = np.isfinite(size) & (size > tolerance)
        if not open_ones.any():
            break
        trial = best + np.where(open_ones, share, 0.0) * _moves(slopes, residual)
        new_residual, new_slopes = around(trial)
        new_size = np.max(np.abs(new_residual), axis=0)
        better = new_size < size
        best = np.where(better, trial, best)
        residual = np.where(better, new_residual, residual)
        slopes = np.where(better[:, None, None], new_slopes, slopes)
        size = np.where(better, new_size, size)
        share = np.where(better, 1.0, share / 2.0)
        if not (open_ones & (share > _SHORTEST)).any():
            break
    return best


def _moves(slopes: Values, residual: Values) -> Values:
    """Return bounded steps (k, n); zero where the slopes are not numbers or do not determine any."""
    usable = np.asarray(np.isfinite(slopes).all(axis=(1, 2)) & np.isfinite(residual).all(axis=0))
    identity = np.eye(slopes.shape[1])
    # A singular matrix would stop the whole stack: a trace of the identity keeps it solvable and the step is bounded.
    safe = np.where(usable[:, None, None], slopes, identity) + 1e-14 * identity
    moves = np.linalg.solve(safe, -residual.T[:, :, None])[:, :, 0].T
    return np.where(usable, np.clip(moves, -_LONGEST, _LONGEST), 0.0)
