"""Dense Paulis, and stim tableaus of symplectic matrices."""

import numpy as np
import stim
from numpy.typing import NDArray

Matrix = NDArray[np.complex128]
ONE = {
    "I": np.eye(2),
    "X": np.array([[0, 1], [1, 0]]),
    "Y": np.array([[0, -1j], [1j, 0]]),
    "Z": np.diag([1, -1]),
}


def class_tableau(matrix: NDArray[np.uint8]) -> stim.Tableau:
    """The tableau with this symplectic part and positive signs."""
    images = [stim.PauliString.from_numpy(xs=row[0::2].astype(bool), zs=row[1::2].astype(bool)) for row in matrix]
    return stim.Tableau.from_conjugated_generators(xs=images[0::2], zs=images[1::2])
