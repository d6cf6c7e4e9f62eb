"""Random numbers by name: a draw belongs to (seed, run, entity, purpose, number), never to the order of events.

Philox4x32-10 (Salmon, Moraes, Dror, Shaw, "Parallel random numbers: as easy as 1, 2, 3", SC 2011) is counter based: the
key is the seed, the counter names the draw. So every strategy meets the same luck, an added aircraft shifts nobody's
numbers, and no worker count, chunk or crash changes a figure. Each block of four 32-bit words gives two uniforms.
"""

from __future__ import annotations

import hashlib
from statistics import NormalDist

import numpy as np
from numpy.typing import NDArray

PURPOSES = ("wear", "unscheduled", "distress", "early", "repair", "findings", "turn", "margin", "lease_in", "demo")
_FIRST_DRAWS = 4  # drawn at a run's start; more come in pairs when an entity asks for them
_MULTIPLIER_0, _MULTIPLIER_1 = np.uint64(0xD2511F53), np.uint64(0xCD9E8D57)
_WEYL_0, _WEYL_1 = 0x9E3779B9, 0xBB67AE85
_LOW = np.uint64(0xFFFFFFFF)
_SHIFT = np.uint64(32)
_normal = NormalDist()


def entity(kind: str, serial: str) -> int:
    """Return the 64-bit name of a serial: blake2b of ``kind/serial``."""
    return int.from_bytes(hashlib.blake2b(f"{kind}/{serial}".encode(), digest_size=8).digest(), "little")


def philox(counter: NDArray[np.uint64], key: tuple[int, int]) -> NDArray[np.uint64]:
    """Return ten rounds of Philox4x32 over counters of shape (4, n), each word below 2**32, as the same shape."""
    c0, c1, c2, c3 = counter
    k0, k1 = key
    for _ in range(10):
        product0 = c0 * _MULTIPLIER_0
        product1 = c2 * _MULTIPLIER_1
        c0, c1, c2, c3 = (
            (product1 >> _SHIFT) ^ c1 ^ np.uint64(k0),
            product1 & _LOW,
            (product0 >> _SHIFT) ^ c3 ^ np.uint64(k1),
            product0 & _LOW,
        )
        k0 = (k0 + _WEYL_0) & 0xFFFFFFFF
        k1 = (k1 + _WEYL_1) & 0xFFFFFFFF
    return np.stack([c0, c1, c2, c3])


def uniforms(
    entities: NDArray[np.uint64], *, seed: int, run: int, purpose: str, block: int = 0, blocks: int = 1
) -> NDArray[np.float64]:
    """Return uniforms in (0, 1), shape (entities, 2 * blocks): the draws of one purpose from a block on."""
    count = len(entities)
    words = np.empty((4, count, blocks), dtype=np.uint64)
    words[0] = (entities & _LOW)[:, None]
    words[1] = (entities >> _SHIFT)[:, None]
    words[2] = np.uint64(run & 0xFFFFFFFF)
    words[3] = (PURPOSES.index(purpose) << 24) + np.arange(block, block + blocks, dtype=np.uint64)[None, :]
    out = philox(words.reshape(4, -1), (seed & 0xFFFFFFFF, (seed >> 32) & 0xFFFFFFFF))
    pairs = np.stack(
        [(out[0] >> np.uint64(5), out[1] >> np.uint64(6)), (out[2] >> np.uint64(5), out[3] >> np.uint64(6))]
    )
    # 53 bits, moved by half a step so that neither 0 nor 1 can come
    values = (pairs[:, 0] * 67108864.0 + pairs[:, 1] + 0.5) / 9007199254740992.0
    return np.asarray(values.T.reshape(count, 2 * blocks), dtype=np.float64)


def one_uniform(name: int, *, seed: int, run: int, purpose: str, number: int) -> float:
    """Return the uniform of that number, for an entity that was not there at the start."""
    pair = uniforms(np.array([name], dtype=np.uint64), seed=seed, run=run, purpose=purpose, block=number // 2)
    return float(pair[0, number % 2])


def normal(uniform: float) -> float:
    """Return the standard normal variate of a uniform, by inversion."""
    return _normal.inv_cdf(uniform)


class Luck:
    """All draws of one run for a fixed list of entities, drawn at once and read as plain floats."""

    __slots__ = ("_names", "_rows", "run", "seed")

    def __init__(self, names: NDArray[np.uint64], purposes: tuple[str, ...], *, seed: int, run: int) -> None:
        self.seed, self.run = seed, run
        self._names = names
        self._rows = {
            purpose: uniforms(names, seed=seed, run=run, purpose=purpose, blocks=_FIRST_DRAWS // 2).tolist()
            for purpose in purposes
        }

    def draw(self, purpose: str, index: int, number: int) -> float:
        """Return draw ``number`` of the entity at ``index``."""
        rows = self._rows[purpose]
        while number >= len(rows[index]):  # as many again for everybody: one vectorised call costs little more than one
            block = len(rows[index]) // 2
            more = uniforms(self._names, seed=self.seed, run=self.run, purpose=purpose, block=block, blocks=block)
            for row, further in zip(rows, more.tolist(), strict=True):
                row.extend(further)
        drawn: float = rows[index][number]
        return drawn

    def named(self, name: int, purpose: str, number: int) -> float:
        """Return a draw of an entity that is not in the list."""
        return one_uniform(name, seed=self.seed, run=self.run, purpose=purpose, number=number)
