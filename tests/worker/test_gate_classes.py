"""The 720 gate classes are the group Sp(4, 2), and act as the gates they stand for."""

import hashlib

import numpy as np
import pytest

from support.stim_oracle import pauli, tableau
from sweepmill_worker.clifford.engine import GATE_CLASSES

FORM = np.kron(np.eye(2, dtype=np.uint8), np.array([[0, 1], [1, 0]], dtype=np.uint8))
"""Two Paulis u and v anticommute iff u FORM v = 1."""


def test_the_classes_are_all_symplectic_and_distinct() -> None:
    # |Sp(4, 2)| = 2^4 (2^2 - 1)(2^4 - 1) = 720: common knowledge of finite groups
    assert GATE_CLASSES.shape == (720, 4, 4)
    assert len({matrix.tobytes() for matrix in GATE_CLASSES}) == 720 == 2**4 * 3 * 15
    for matrix in GATE_CLASSES:
        np.testing.assert_array_equal(matrix @ FORM @ matrix.T % 2, FORM)


def test_the_classes_are_closed_under_products() -> None:
    members = {matrix.tobytes() for matrix in GATE_CLASSES}
    for first in GATE_CLASSES[::37]:
        assert all((first @ second % 2).astype(np.uint8).tobytes() in members for second in GATE_CLASSES)


def test_the_numbering_of_the_classes_is_frozen() -> None:
    """Other numbers would be other trajectories under the same key."""
    digits = (GATE_CLASSES.reshape(720, 16) @ (1 << np.arange(15, -1, -1))).tolist()
    assert digits == sorted(digits)
    assert hashlib.sha256(GATE_CLASSES.tobytes()).hexdigest()[:16] == "3468ef10adecfb5d"


@pytest.mark.parametrize("first", range(0, 720, 90))
def test_every_class_maps_paulis_as_its_gate_does(first: int) -> None:
    for number in range(first, first + 90):
        for bits in range(1, 16):
            vector = np.array([bits >> 3 & 1, bits >> 2 & 1, bits >> 1 & 1, bits & 1], dtype=np.uint8)
            image = tableau(number)(pauli(vector))
            expected = pauli(vector @ GATE_CLASSES[number] % 2)
            assert image.to_numpy()[0].tolist() == expected.to_numpy()[0].tolist()
            assert image.to_numpy()[1].tolist() == expected.to_numpy()[1].tolist()
