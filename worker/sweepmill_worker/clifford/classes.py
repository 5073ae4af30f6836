"""The 720 two-qubit Clifford gates that differ by more than Paulis and phase: the group Sp(4, 2).

Convention.  A Pauli on two sites is the row vector (x_left, z_left, x_right, z_right) over GF(2); signs are dropped.
A class is a 4 x 4 matrix M whose row i is the image of the i-th unit vector (X_left, Z_left, X_right, Z_right), so
that conjugation sends the row vector v to v @ M mod 2.  Classes are numbered in increasing order of their matrices,
read row by row as binary numbers: the numbering is part of the ensemble's revision.
"""

from itertools import product
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray


def _images() -> list[tuple[int, int, int, int]]:
    def commutator(a: int, b: int) -> int:
        swapped = (b & 0b1010) >> 1 | (b & 0b0101) << 1
        return (a & swapped).bit_count() & 1

    return [
        (a, b, c, d)
        for a, b in product(range(16), repeat=2)
        if commutator(a, b)
        for c, d in product(range(16), repeat=2)
        if commutator(c, d) and not any(commutator(i, j) for i in (a, b) for j in (c, d))
    ]


def _matrices() -> NDArray[np.uint8]:
    images = np.array(sorted(_images()), dtype=np.uint8)
    return (images[:, :, None] >> np.array([3, 2, 1, 0], dtype=np.uint8)) & np.uint8(1)


GATE_CLASSES: NDArray[np.uint8] = _matrices()
"""uint8[720, 4, 4], see the convention above."""
GATE_CLASSES.flags.writeable = False


class Masks(NamedTuple):
    """How a gate combines columns.

    The 16 patterns take 512 bytes and stay in the fastest cache, where masks per class would compete with the state.
    """

    patterns: NDArray[np.uint64]
    """[64]: pattern p, 0 .. 15, has at 4 * p + i all ones if bit i of p is set."""
    codes: NDArray[np.uint32]
    """[720]: byte j of a class is 4 * pattern, where bit i of the pattern: new column j contains old column i."""


def column_masks() -> Masks:
    """The masks of all classes."""
    bits = (np.arange(64) // 4) >> (np.arange(64) % 4) & 1
    patterns = (GATE_CLASSES.astype(np.int64) << np.arange(4)[:, None]).sum(axis=1)
    codes = (4 * patterns << 8 * np.arange(4)).sum(axis=1)
    return Masks(np.where(bits, np.uint64(0xFFFFFFFFFFFFFFFF), np.uint64(0)), codes.astype(np.uint32))
