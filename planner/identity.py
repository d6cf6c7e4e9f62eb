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
    """Return a hash of fixed variates, by the functions through which draws and wear go: exp, log, powers.

    Both the vectorised functions (draws) and the scalar ones (events) are asked, since they come from two libraries.
    """
    uniforms = (np.arange(PROBED_VARIATES) + 0.5) / PROBED_VARIATES
    exponential = -np.log1p(-uniforms)
    weibull = exponential ** (1.0 / 2.7)
    wear = 13.0 * (1.0 - np.exp(-weibull)) + 4.3 * weibull
    scalar = np.array([math.exp(-x) + math.log(x) + x**0.37 + math.expm1(x) for x in uniforms.tolist()])
    return hashlib.sha256(b"".join(x.tobytes() for x in (exponential, weibull, wear, scalar))).hexdigest()


def identity() -> Identity:
    """Return who this process is."""
    return Identity(program_version(), sources(), probe(), socket.gethostname(), os.getpid())
