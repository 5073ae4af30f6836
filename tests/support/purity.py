"""Exact average purities of random unitary brickworks: the two-wall recursion.

For any 2-design of two-qubit gates the average of gate x gate twirls SWAP on one site into w (1 + SWAP on both),
w = q / (q^2 + 1): a wall between sites moves one step left or right with weight w whenever a gate straddles it
(Operator spreading in random unitary circuits, PRX 8, 021014 (2018), 1705.08975; formula from memory, digits derived
independently).
"""

import numpy as np
from numpy.typing import NDArray

WEIGHT = 2 / 5


def purities(sites: int, layers: int) -> NDArray[np.float64]:
    """f[a, b] = average purity of the sites a .. b - 1 after some layers on an open chain of |0>."""
    f = np.ones((sites + 1, sites + 1))
    for layer in range(1, layers + 1):
        hop = np.zeros((sites + 1, sites + 1))
        for wall in range(sites + 1):
            if 1 <= wall <= sites - 1 and wall % 2 == layer % 2:
                hop[wall, wall - 1] = hop[wall, wall + 1] = WEIGHT
            else:
                hop[wall, wall] = 1
        f = hop @ f @ hop.T
        np.fill_diagonal(f, 1)
    return f
