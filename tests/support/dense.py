"""Operations on density matrices of a few qubits: rows of a circuit by the rules of quantum mechanics alone.

Qubit 0 is the most significant. Gates come as matrices from stim's tableaus; everything else is written out.
"""

from collections.abc import Sequence
from functools import reduce
from typing import Any

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.program import operations as op
from sweepmill_worker.reference.paulis import Row, row_pauli, row_sites, row_tableau

Matrix = NDArray[np.complex128]
PAULIS: dict[str, Matrix] = {
    "_": np.eye(2, dtype=np.complex128),
    "X": np.array([[0, 1], [1, 0]], dtype=np.complex128),
    "Y": np.array([[0, -1j], [1j, 0]]),
    "Z": np.array([[1, 0], [0, -1]], dtype=np.complex128),
}
_LOWER: Matrix = np.array([[0, 1], [0, 0]], dtype=np.complex128)


def product(letters: Sequence[str], sites: Sequence[int], qubits: int) -> Matrix:
    """A Pauli product as a matrix."""
    factors = ["_"] * qubits
    for letter, site in zip(letters, sites, strict=True):
        factors[site] = letter
    return _kron([PAULIS[factor] for factor in factors])


def start(initial_state: str, qubits: int) -> Matrix:
    """All zeros, all plus or maximally mixed."""
    one = {"zeros": PAULIS["_"] + PAULIS["Z"], "plus": PAULIS["_"] + PAULIS["X"], "mixed": PAULIS["_"]}[initial_state]
    return _kron([one / 2] * qubits)


def apply(state: Matrix, row: Row, qubits: int, outcome: int) -> Matrix:
    """One operation; of a measurement the branch of `outcome`, not normalized, so that traces are probabilities."""
    match row[op.CODE]:
        case op.GATE:
            gate = _on(row_tableau(row).to_unitary_matrix(endian="big"), row_sites(row), qubits)
            return _matrix(gate @ state @ gate.conj().T)
        case op.MEASURE if row[op.FLAGS]:
            projector = (np.eye(2**qubits) + (-1) ** outcome * product(*row_pauli(row), qubits)) / 2
            return _matrix(projector @ state @ projector)
        case op.MEASURE:
            pauli = product(*row_pauli(row), qubits)
            return _matrix((state + pauli @ state @ pauli) / 2)
        case op.DEPOLARISE:
            return reduce(lambda held, site: _depolarized(held, site, qubits), row_sites(row), state)
        case op.RESET:
            return reduce(lambda held, site: _reset(held, site, qubits), row_sites(row), state)
    raise ValueError(f"not here: {row}")


def of_stabilizers(stabilizers: Sequence[Any], qubits: int) -> Matrix:
    """The product of (1 + g) / 2 over the generators, divided by two per generator that a pure state has more."""
    state = np.eye(2**qubits, dtype=np.complex128) / 2**qubits
    for one in stabilizers:
        letters = ["_XYZ"[one[q]] for q in range(qubits)]
        state = state @ (np.eye(2**qubits) + one.sign * product(letters, range(qubits), qubits))
    return _matrix(state)


def _depolarized(state: Matrix, site: int, qubits: int) -> Matrix:
    return _matrix(sum(p @ state @ p for p in (product(x, [site], qubits) for x in PAULIS)) / 4)


def _reset(state: Matrix, site: int, qubits: int) -> Matrix:
    keep = (np.eye(2**qubits) + product("Z", [site], qubits)) / 2
    lower = _on(_LOWER, [site], qubits)
    return _matrix(keep @ state @ keep + lower @ state @ lower.conj().T)


def _on(matrix: Any, sites: Sequence[int], qubits: int) -> Matrix:
    """A matrix on some qubits, as one on all of them."""
    rest = [q for q in range(qubits) if q not in sites]
    order = [*sites, *rest]
    full = np.kron(matrix, np.eye(2 ** len(rest))).reshape([2] * (2 * qubits))
    back = np.argsort(order)
    moved = full.transpose([*back, *(qubits + back)])
    return _matrix(moved.reshape(2**qubits, 2**qubits))


def _kron(factors: Sequence[Matrix]) -> Matrix:
    return _matrix(reduce(lambda left, right: _matrix(np.kron(left, right)), factors))


def _matrix(value: Any) -> Matrix:
    return np.asarray(value, dtype=np.complex128)
