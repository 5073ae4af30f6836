"""Stabilizer rows as arrays, and entropies from their ranks."""

from collections.abc import Iterable, Sequence
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


def entropy(rows: Rows, region: Sequence[int]) -> int:
    """Of a region, in bits: its size minus the generators that live on it alone.

    Those are all rows less the rank of the rows on the rest of the qubits.  Source: Entanglement in the stabilizer
    formalism, quant-ph/0406168.
    """
    outside = np.setdiff1d(np.arange(rows.x.shape[1]), np.asarray(region, dtype=np.int64))
    columns = np.concatenate([rows.x[:, outside], rows.z[:, outside]], axis=1)
    return len(region) - len(columns) + rank(int.from_bytes(np.packbits(column).tobytes()) for column in columns.T)


def rank(vectors: Iterable[int]) -> int:
    """Rank over GF(2) of vectors written as integers."""
    basis: dict[int, int] = {}
    for vector in vectors:
        while vector and vector.bit_length() in basis:
            vector ^= basis[vector.bit_length()]
        if vector:
            basis[vector.bit_length()] = vector
    return len(basis)
