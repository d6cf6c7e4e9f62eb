"""Who computes: the version, the sources and the arithmetic of this process, so that unlike workers are refused.

Figures are byte-identical between processes whose identity is the same, and only statistically equal otherwise: the
last digit of a logarithm depends on the machine's mathematics library. Workers load this module.
"""

from __future__ import annotations

import hashlib
import math
import os
import socket
from functools import cache
from importlib.metadata import PackageNotFoundError, version
from typing import NamedTuple

import numpy as np

from planner.fingerprint import sources
from sim.draws import normal, uniforms
from sim.hazard import age_when
from sim.wear import gained, wear_law

PROBED_VARIATES = 4096


class Identity(NamedTuple):
    """Version of Spoolwright, hash of its sources, hash of fixed variates; and which process of which machine."""

    version: str
    sources: str
    probe: str
    host: str
    process: int

    def differs_from(self, other: Identity) -> str:
        """Return in words what sets this process apart from the other in a way that can change a figure, or ''."""
        if self.version != other.version:
            return f"it runs version {self.version}, the study runs {other.version}"
        if self.sources != other.sources:
            return f"its sources ({self.sources[:8]}) are not those of the study ({other.sources[:8]})"
        if self.probe != other.probe:
            return f"its arithmetic ({self.probe[:8]}) gives other last digits than the study's ({other.probe[:8]})"
        return ""


@cache
def program_version() -> str:
    """Return the installed version, or 'not installed' when the sources are used as they lie."""
    try:
        return version("spoolwright")
    except PackageNotFoundError:
        return "not installed"


@cache
def probe() -> str:
    """Return a hash of 4,096 fixed variates and wear values, by the very functions that a run goes through."""
    names = np.arange(PROBED_VARIATES, dtype=np.uint64)
    drawn = uniforms(names, seed=1, run=0, purpose="wear")[:, 0].tolist()
    law = wear_law(
        early_loss_degC=13.0,
        early_scale_cycles=700.0,
        loss_degC_per_1000_cycles=4.3,
        loss_degC_per_1000_hours=0.25,
        unrecoverable_degC=15.0,
        fuel_frac_per_degC=0.0005,
    )
    ages = [age_when(-math.log(uniform), 100.0, 2.7, 14_200.0) for uniform in drawn]
    factors = [math.exp(0.1 * normal(uniform)) for uniform in drawn]
    wear = [factor * gained(law, 0.0, age, 1.6) for factor, age in zip(factors, ages, strict=True)]
    return hashlib.sha256(np.array([drawn, ages, wear]).tobytes()).hexdigest()


def identity() -> Identity:
    """Return who this process is."""
    return Identity(program_version(), sources(), probe(), socket.gethostname(), os.getpid())
