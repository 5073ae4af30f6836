"""Exact average purities of random unitary brickworks: the two-wall recursion, also with a depolarised edge.

For any 2-design of two-qubit gates the average of gate x gate twirls SWAP on one site into w (1 + SWAP on both),
w = q / (q^2 + 1): a wall between sites moves one step left or right with weight w whenever a gate straddles it
(Operator spreading in random unitary circuits, PRX 8, 021014 (2018), 1705.08975; formula from memory, digits derived
independently).  A site that becomes maximally mixed leaves the region and gives 1 / q.
"""

import numpy as np
from numpy.typing import NDArray

WEIGHT = 2 / 5
Floats = NDArray[np.float64]


def purities(sites: int, layers: int, bath: int = 0) -> Floats:
    """f[a, b] = average purity of the sites a .. b - 1 after some layers on an open chain of |0>.

    bath: after every so many layers site 0 is depolarised; 0 means never.
    """
    f = np.ones((sites + 1, sites + 1))
    for layer in range(1, layers + 1):
        hop = hops(sites, layer)
        f = hop @ f @ hop.T
        np.fill_diagonal(f, 1)
        if bath and layer % bath == 0:
            f[0, 1:] = f[1, 1:] / 2
    return f


def hops(sites: int, layer: int) -> Floats:
    """Weights of the moves of a wall in a layer."""
    hop = np.eye(sites + 1)
    for wall in range(2 - layer % 2, sites, 2):
        hop[wall, wall] = 0
        hop[wall, wall - 1] = hop[wall, wall + 1] = WEIGHT
    return hop


def emitted(sites: int, first: int, last: int, before: Floats | None = None) -> float:
    """Average purity of what the bath takes and keeps of layers first .. last.

    After every layer the qubit of site 0 is replaced by half of a fresh Bell pair; the window is the qubits taken and
    the other halves.  before[b]: average purity of the sites 0 .. b - 1 before the window, of the product start unless
    given.  A wall at b says that the sites below b belong to the region; with none there, a fresh half is alone.
    """
    walls = purities(sites, first - 1, bath=1)[0] if before is None else before
    for layer in range(first, last + 1):
        walls = hops(sites, layer) @ walls
        walls[0] = walls[1] / 2
    return float(walls[0])


def scaled_bath_purities(layers: int) -> Floats:
    """(5/4)^t times the average purity of a semi-infinite chain after t = 1 .. layers, site 0 depolarised each time.

    The wall on the right is at infinity; the cone of site 0 stays within the walls that are kept.
    """
    f, found = np.ones(layers + 2), np.empty(layers)
    for layer in range(1, layers + 1):
        start, end = 2 - layer % 2, layers + 2 - layer
        f[start:end:2] = (f[start - 1 : end - 1 : 2] + f[start + 1 : end + 1 : 2]) / 2
        other = 3 - start
        f[other:end:2] *= 1.25
        f[0] = f[1] / 2
        found[layer - 1] = f[0]
    return found


def scaled_bulk_purities(layers: int) -> Floats:
    """(5/4)^w times the average purity of windows of w = 1 .. layers layers late in the bath's time.

    As `emitted`, after a past that leaves the sites near the edge maximally mixed.
    """
    f, found = 0.5 ** np.arange(layers + 3.0), np.empty(layers)
    for layer in range(1, layers + 1):
        start, end = 2 - layer % 2, layers + 2
        f[start:end:2] = (f[start - 1 : end - 1 : 2] + f[start + 1 : end + 1 : 2]) / 2
        other = 3 - start
        f[other:end:2] *= 1.25
        f[0] = f[1] / 2
        found[layer - 1] = f[0]
    return found
