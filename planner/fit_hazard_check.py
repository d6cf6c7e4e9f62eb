"""Does the fitted hazard fit? Failures seen against failures expected, age band by age band.

With bands that each hold about the same expected count, ``Z_j = seen_j - expected_j`` is asymptotically normal with
covariance ``V = A - C' i^-1 C``, because the parameters were fitted to the same records. With ``g`` the derivatives of
the log hazard by the parameters and dE the expected failures, A holds the expected counts, ``C = integral of g dE``
over each band and ``i = integral of g g' dE`` over all. ``Z' V^- Z`` is chi-squared; V has one rank less than bands
(Hjort, "Goodness of fit tests in models for life history data", *Annals of Statistics* 18, 1990; Bagdonavicius and
Nikulin, *Comm. in Statistics* 40, 2011). By log scale and log shape ``g = (-k, 1 + log H)``, whose integrals over H are
closed: ``H``, ``H log H`` and ``H log^2 H + H``.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
from scipy.stats import chi2

from planner.fit_hazard import Array, Fit, Lives

# The chi-squared form wants some five failures a band (a common rule for counts), and three bands to see a bend.
FAILURES_A_BAND = 5
LEAST_BANDS, MOST_BANDS = 3, 8


class Goodness(NamedTuple):
    """The test's result: statistic, degrees of freedom, chance of one as large if the law holds, and the bands."""

    statistic: float
    degrees: int
    chance: float
    edges: Array
    seen: Array
    expected: Array


def goodness(data: Lives, fit: Fit) -> Goodness | None:
    """Return how well a fitted hazard agrees with the failures' ages; None when there are too few for the test.

    Failures known to lie between two looks count at the middle, so looks should be short against the life.
    """
    bands = min(MOST_BANDS, data.failures // FAILURES_A_BAND)
    if bands < LEAST_BANDS or fit.scale is None:
        return None
    middle = np.where(data.failed, (data.low + np.where(data.failed, data.high, 0.0)) / 2.0, data.low)
    edges = _edges(data.entry, middle, bands=bands, shape=fit.shape, scale=fit.scale)
    seen = np.histogram(middle[data.failed], bins=edges)[0].astype(float)
    expected, mixed, squares = _integrals(data.entry, middle, edges, shape=fit.shape, scale=fit.scale)
    c = np.array([-fit.shape * expected, mixed])
    information = np.array(
        [
            [fit.shape**2 * expected.sum(), -fit.shape * mixed.sum()],
            [-fit.shape * mixed.sum(), squares.sum()],
        ]
    )
    if fit.held:
        c, information = c[:1], information[:1, :1]
    covariance = np.diag(expected) - c.T @ np.linalg.solve(information, c)
    gap = seen - expected
    statistic = float(gap @ np.linalg.pinv(covariance, rcond=1e-9, hermitian=True) @ gap)
    return Goodness(statistic, bands - 1, float(chi2.sf(statistic, bands - 1)), edges, seen, expected)


def _integrals(entry: Array, end: Array, edges: Array, *, shape: float, scale: float) -> tuple[Array, Array, Array]:
    """Return for each band of age the integrals of 1, of g, and of g squared over the hazard gathered by all lives."""
    inside_from = (np.clip(entry[:, None], edges[None, :-1], edges[None, 1:]) / scale) ** shape
    inside_to = (np.clip(end[:, None], edges[None, :-1], edges[None, 1:]) / scale) ** shape
    inside_to = np.maximum(inside_to, inside_from)
    # x log x is 0 at 0
    log_from, log_to = np.log(np.maximum(inside_from, 1e-300)), np.log(np.maximum(inside_to, 1e-300))
    gathered = inside_to - inside_from
    mixed = inside_to * log_to - inside_from * log_from
    squares = inside_to * log_to**2 - inside_from * log_from**2 + gathered
    return gathered.sum(axis=0), mixed.sum(axis=0), squares.sum(axis=0)


def _edges(entry: Array, end: Array, *, bands: int, shape: float, scale: float) -> Array:
    """Return bands of age in which about the same number of failures is expected."""
    fine = np.linspace(0.0, float(end.max()), 400)
    gathered = np.concatenate([[0.0], np.cumsum(_integrals(entry, end, fine, shape=shape, scale=scale)[0])])
    inner = np.interp(np.arange(1, bands) / bands * gathered[-1], gathered, fine)
    return np.concatenate([[0.0], inner, [float(end.max()) * (1.0 + 1e-12)]])
