"""Luck of the scenario: a uniform by name, so that a row keeps its value however many others there are."""

from __future__ import annotations

import hashlib

_GOLDEN_FRAC = 0.6180339887498949  # (sqrt(5) - 1) / 2: its multiples spread most evenly, however many are taken


def uniform(seed: int, *names: object) -> float:
    """Return a uniform in (0, 1) that depends on the names alone."""
    digest = hashlib.blake2b("/".join(str(n) for n in (seed, *names)).encode(), digest_size=7).digest()
    return ((int.from_bytes(digest, "little") >> 3) + 0.5) / 2**53


def spread(number: int, start: float) -> float:
    """Return the ``number``-th (from 0) of a sequence in [0, 1) that is even at any length."""
    return (start + number * _GOLDEN_FRAC) % 1.0


def between(low: float, high: float, seed: int, *names: object) -> float:
    return low + (high - low) * uniform(seed, *names)
