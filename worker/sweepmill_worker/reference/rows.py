"""Stabilizer rows as arrays."""

from collections.abc import Sequence
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray


class Rows(NamedTuple):
    """Independent generators of a stabilizer group on n qubits; fewer than n if the state is mixed."""

    x: NDArray[np.bool_]
    """[rows, n]"""
    z: NDArray[np.bool_]
    """[rows, n]; a Y has both bits."""
    signs: NDArray[np.bool_]
    """[rows]: true for -1."""


def rows_of(stabilizers: Sequence[Any], qubits: int) -> Rows:
    """Arrays of `stim.PauliString` objects of length `qubits`."""
    bits = [string.to_numpy() for string in stabilizers]
    x = np.array([one for one, _ in bits], dtype=bool).reshape(len(bits), qubits)
    z = np.array([one for _, one in bits], dtype=bool).reshape(len(bits), qubits)
    return Rows(x, z, np.array([string.sign.real < 0 for string in stabilizers], dtype=bool))
