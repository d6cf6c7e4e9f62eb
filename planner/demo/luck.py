"""Luck of the scenario: a uniform by name, so that a row keeps its value however many others there are."""

from __future__ import annotations

import hashlib


def uniform(seed: int, *names: object) -> float:
    """Return a uniform in (0, 1) that depends on the names alone."""
    digest = hashlib.blake2b("/".join(str(n) for n in (seed, *names)).encode(), digest_size=7).digest()
    return ((int.from_bytes(digest, "little") >> 3) + 0.5) / 2**53


def between(low: float, high: float, seed: int, *names: object) -> float:
    return low + (high - low) * uniform(seed, *names)
