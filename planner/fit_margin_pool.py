"""What the engines of a type have in common: means and spreads of rate, early loss and wash gain, by partial pooling.

Each stretch says ``J theta = h`` of its own theta = (rate, early, gain), with its level free; theta varies between
stretches as a normal with mean mu and independent deviations. Expectation-maximisation (Laird and Ware, *Biometrics*
38, 1982) finds mu and the deviations; a stretch with many readings keeps its own slope, one with few takes the type's.
Weak beliefs from the wear table stand behind them (one pseudo-observation on mu, two on the deviations), so that what
the records say nothing of falls back on the table instead of anything at all.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from planner.fit_margin import Array, MarginFit, Prior, Stretch, fit_stretch, information
from planner.fit_margin_steps import found_steps

# Deviations between engines start from a fifth of the mean and are never taken below a fiftieth of it.
START_FRAC, LEAST_FRAC = 0.2, 0.02
LEAST_DEGC = 0.05
BELIEFS = 2.0


class Belief(NamedTuple):
    """What the wear and wash tables say of rate, early loss and gain; stands in where the records are silent."""

    rate_degC_per_1000_cycles: float
    early_degC: float
    gain_degC: float

    def means(self) -> Array:
        return np.array([self.rate_degC_per_1000_cycles, self.early_degC, self.gain_degC])

    def scales(self) -> Array:
        """Return the size of each figure, with one degree at least where the table has none."""
        return np.maximum(np.abs(self.means()), 1.0)


class Pooled(NamedTuple):
    """The fits of all stretches of a group, what they have in common, and the noise of a reading."""

    fits: list[MarginFit]
    prior: Prior
    noise_degC: float


def wide_prior(belief: Belief) -> Prior:
    """Return the prior before any engine has been looked at."""
    scales = belief.scales()
    return Prior(belief.means(), scales * 0.5, np.diag(scales**2))


def pooled_prior(precisions: Array, sides: Array, belief: Belief, *, rounds: int = 400) -> Prior:
    """Return the type's means, spreads and the means' covariance from each stretch's information (n x 3 x 3, n x 3)."""
    believed, scales = belief.means(), belief.scales()
    start = (START_FRAC * scales) ** 2
    floor = np.maximum(LEAST_FRAC * scales, LEAST_DEGC) ** 2
    mean, variance = believed.copy(), start.copy()
    count = len(sides)
    for _ in range(rounds):
        covariances = np.linalg.inv(precisions + np.diag(1.0 / variance))
        own = np.einsum("nij,nj->ni", covariances, sides + mean / variance)
        before = mean
        mean = (own.sum(axis=0) / variance + believed / scales**2) / (count / variance + 1.0 / scales**2)
        spread = np.einsum("nii->ni", covariances) + (own - mean) ** 2
        new = np.maximum((spread.sum(axis=0) + BELIEFS * start) / (count + BELIEFS), floor)
        change = np.max(np.abs(new - variance) / variance) + np.max(np.abs(mean - before) / scales)
        variance = new
        if change < 1e-7:
            break
    inner = np.linalg.inv(precisions + np.diag(1.0 / variance))
    seen = precisions - precisions @ inner @ precisions
    covariance = np.linalg.inv(seen.sum(axis=0) + np.diag(1.0 / scales**2))
    return Prior(mean, np.sqrt(variance), covariance)


def pool(stretches: list[Stretch], belief: Belief, *, noise_degC: float) -> Pooled:
    """Return the fits of a group of stretches that wear alike, readings having so much noise.

    Steps are looked for again each time the type's prior has become narrower, since a doubtful step shows best against
    a rate that is known.
    """
    prior = wide_prior(belief)
    fits: list[MarginFit] = []
    for _ in range(3):
        fits = [
            fit_stretch(one, prior, noise_degC=noise_degC, steps=found_steps(one, prior, noise_degC=noise_degC))
            for one in stretches
        ]
        told = [information(fit) for fit in fits]
        prior = pooled_prior(np.array([j for j, _ in told]), np.array([h for _, h in told]), belief)
    known = [tuple(step for step in fit.steps if step not in fit.stretch.known_steps) for fit in fits]
    fits = [
        fit_stretch(one, prior, noise_degC=noise_degC, steps=steps) for one, steps in zip(stretches, known, strict=True)
    ]
    return Pooled(fits, prior, noise_degC)
