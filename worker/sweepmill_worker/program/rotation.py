"""A two-site gate read sideways: projections and a gate that act on time slices instead of sites.

A gate U with legs a, b in and a', b' out becomes the tensor R[a a'; b b'] = U[a' b'; a b] that maps the slices (b, b')
to the slices (a, a').  Modulo signs U relates Paulis l = (p_a, q_a) of the left legs to r = (p_b, q_b) of the right
ones whenever (p_a p_b) U = (q_a q_b), and a group G of slices goes to all (l, rest) with (r, rest) in G for a related
r.  The r related to l = 0 have to be in the group first: they are measured, with forced outcomes.  On what commutes
with them the relation is a symplectic map, modulo the l related to r = 0, and any gate that extends it will do.

Source of the classes: Postselection-free entanglement dynamics via spacetime duality, Physical Review Letters 126,
060501 (2021), arXiv:2010.15840; the relation is worked out here.
"""

from functools import cache
from itertools import product

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.clifford.classes import GATE_CLASSES

_PAULIS = np.array(list(product((0, 1), repeat=4)), dtype=np.uint8)
_PLACE_VALUES = np.array([8, 4, 2, 1], dtype=np.int64)
_LETTERS = (0, 3, 1, 2)  # of x z = 00, 01, 10, 11: I 0, X 1, Y 2, Z 3


@cache
def rotated_table() -> NDArray[np.int64]:
    """int64[720, 4]: number of projections, the letters of the first and of the second, and the class of the gate.

    Letters are base-4 digits, 0 for a projection that is not there.  Of several gates that will do, the first.
    """
    return np.array([rotated(number) for number in range(len(GATE_CLASSES))], dtype=np.int64)


@cache
def _images() -> NDArray[np.int64]:
    """int64[720, 16]: the image of every Pauli, x z x z read as a binary number, under every class."""
    return (_PAULIS @ GATE_CLASSES & 1) @ _PLACE_VALUES


def relation(number: int) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """int64[16] twice: all pairs of related Paulis l = (p_a, q_a) and r = (p_b, q_b), x z x z as binary numbers."""
    before, after = np.arange(16), _images()[number]
    return before & 12 | after >> 2, (before & 3) << 2 | after & 3


def rotated(number: int) -> tuple[int, int, int, int]:
    """One row of the table."""
    left, right = relation(number)
    only_left, only_right = left[right == 0], right[(left == 0) & (right != 0)]
    projected = sorted(_letters(int(pauli)) for pauli in only_right)[: {0: 0, 1: 1, 3: 2}[len(only_right)]]
    gate = int(np.flatnonzero(np.isin(_images()[:, right] ^ left, only_left).all(axis=1))[0])
    first, second = [*projected, 0, 0][:2]
    return len(projected), first, second, gate


def _letters(pauli: int) -> int:
    return 4 * _LETTERS[pauli >> 2] + _LETTERS[pauli & 3]
