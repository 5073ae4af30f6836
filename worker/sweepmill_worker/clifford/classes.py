"""The 720 two-qubit Clifford gates that differ by more than Paulis and phase: the group Sp(4, 2).

Convention.  A Pauli on two sites is the row vector (x_left, z_left, x_right, z_right) over GF(2); signs are dropped.
A class is a 4 x 4 matrix M whose row i is the image of the i-th unit vector (X_left, Z_left, X_right, Z_right), so
that conjugation sends the row vector v to v @ M mod 2.  Classes are numbered in increasing order of their matrices,
read row by row as binary numbers: the numbering is part of the ensemble's revision.
"""

from itertools import product

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


def column_masks() -> NDArray[np.uint32]:
    """uint32[720 * 16]: per class, all ones at 4 * j + i where the new column j contains the old column i.

    64 bytes per class, so a gate of the kernel touches one cache line of the table.
    """
    return np.ascontiguousarray(
        np.where(GATE_CLASSES.transpose(0, 2, 1), np.uint32(0xFFFFFFFF), np.uint32(0)).reshape(-1)
    )
