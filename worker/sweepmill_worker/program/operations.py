"""What a circuit consists of once everything random about it is decided: rows of integers.

A row has the columns code, n, s0, s1, s2, s3, gate, frame, letters, flags, kind, place.  Sites beyond the n-th are -1;
columns that mean nothing for a code are 0.
"""

from itertools import product
from typing import Final

import numpy as np
from numpy.typing import NDArray

GATE: Final = 0
"""A Clifford gate on one or two sites: its class, then a Pauli frame."""
MEASURE: Final = 1
"""A Pauli product.  With flags 0 its outcome is lost: dephasing."""
DEPOLARISE: Final = 2
"""Every site of the row becomes maximally mixed."""
RESET: Final = 3
"""Every site of the row is traced out, then |0>."""
SWAP_IN: Final = 4
"""The site's qubit is traced out; a fresh Bell pair of the site (s0) and a reference (s1), in |0> before."""

COLUMNS: Final = 12
CODE, SITES, SITE, CLASS, FRAME, LETTERS, FLAGS, KIND, PLACE = 0, 1, 2, 6, 7, 8, 9, 10, 11
"""Positions of the columns; the four sites begin at SITE."""

RECORDED: Final = 1
FORCED: Final = 2

WIDEST: Final = 4
"""Sites of a row."""


def _one_site_classes() -> NDArray[np.uint8]:
    images = [(a, b) for a, b in product(range(1, 4), repeat=2) if a != b]
    shifts = np.array([1, 0], dtype=np.uint8)
    return (np.array(images, dtype=np.uint8)[:, :, None] >> shifts) & np.uint8(1)


ONE_SITE_CLASSES: Final[NDArray[np.uint8]] = _one_site_classes()
"""uint8[6, 2, 2]: rows are the images (x, z) of X and Z, in increasing order as `clifford.classes.GATE_CLASSES`."""
ONE_SITE_CLASSES.flags.writeable = False
