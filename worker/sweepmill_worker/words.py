"""Random words: Philox4x32-10, so that every decision of a trajectory is a pure function of its place.

The generator is that of "Parallel random numbers: as easy as 1, 2, 3" (SC11, 2011).  Key: the first 64 bits of the
ensemble key as two words.  Counter: (kind << 24 | block, layer, k mod 2**32, k >> 32).  The word of place i of a kind
is lane i % 4 of block i // 4.  Layers count from 1; k is the number of the trajectory.

Gates: class = (word * 720) >> 32, so probabilities of classes differ from 1/720 by less than 2**-32, a relative bias
below 2e-7.  Measurements: a site is measured iff word < floor(p * 2**32), which resolves p to 2**-32 and is exact
at p = 0 and p = 1.  Both deviations are far below the error bar of any ensemble that can be sampled.
"""

from typing import Final

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.jit import entry, part

GATE: Final = 1
"""Place: ordinal of the bond in its layer, (0,1), (2,3), ... or (1,2), ..., (L-1,0)."""
MEASURE: Final = 2
"""Place: site."""

U = np.uint64
_LOW = np.uint64(0xFFFFFFFF)
_32 = np.uint64(32)
_M0, _M1 = np.uint64(0xD2511F53), np.uint64(0xCD9E8D57)
_W0, _W1 = np.uint64(0x9E3779B9), np.uint64(0xBB67AE85)


@part
def _round(c0: U, c1: U, c2: U, c3: U, k0: U, k1: U) -> tuple[U, U, U, U]:
    first, second = _M0 * c0, _M1 * c2
    return (second >> _32) ^ c1 ^ k0, second & _LOW, (first >> _32) ^ c3 ^ k1, first & _LOW


@part
def philox(c0: U, c1: U, c2: U, c3: U, k0: U, k1: U) -> tuple[U, U, U, U]:
    """Four words of one counter (all uint64 holding 32 bits)."""
    for _ in range(10):
        c0, c1, c2, c3 = _round(c0, c1, c2, c3, k0, k1)
        k0, k1 = (k0 + _W0) & _LOW, (k1 + _W1) & _LOW
    return c0, c1, c2, c3


@entry
def fill(
    out: NDArray[np.uint32],
    places: NDArray[np.uint32],
    layers: NDArray[np.uint32],
    first_layer: int,
    k: np.uint64,
    key: tuple[int, int],
) -> None:
    """Fill out[4 * i : 4 * i + 4] with the words of counter (places[i], first_layer + layers[i], k)."""
    low, high = np.uint64(k) & _LOW, np.uint64(k) >> _32
    k0, k1 = np.uint64(key[0]), np.uint64(key[1])
    layer = np.uint64(first_layer)
    for i in range(len(places)):
        w0, w1, w2, w3 = philox(np.uint64(places[i]), layer + np.uint64(layers[i]), low, high, k0, k1)
        out[4 * i] = w0
        out[4 * i + 1] = w1
        out[4 * i + 2] = w2
        out[4 * i + 3] = w3


def counters(kind: int, places: int) -> NDArray[np.uint32]:
    """The first counter words of the blocks that hold `places` places of a kind."""
    return (kind << 24) + np.arange((places + 3) // 4, dtype=np.uint32)


def words(key: tuple[int, int], kind: int, layer: int, k: int, places: int) -> NDArray[np.uint32]:
    """The words of places 0 .. places - 1 of a kind, in one layer of trajectory k."""
    blocks = counters(kind, places)
    out = np.empty(4 * len(blocks), dtype=np.uint32)
    fill(out, blocks, np.zeros_like(blocks), layer, np.uint64(k), key)
    return out[:places]
