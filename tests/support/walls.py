"""Average purities with a depolarized edge, exactly: the walk of one wall, rescaled so that nothing underflows.

The recursion is that of `support.purity` with the edge qubit depolarized after every layer. Values and asymptotics
(logarithm 1/2 at the edge, 3/2 in the bulk, slope log2(5/4) bits per layer) were derived independently and checked by
brute force; published form: Fractal, logarithmic, and volume-law entangled nonthermal steady states via spacetime
duality, Phys. Rev. X 12, 011045 (2022).
"""

import numpy as np
from numpy.typing import NDArray

RATE = float(np.log2(5 / 4))


def edge_entropies(layers: int) -> NDArray[np.float64]:
    """-log2 of the average purity of a whole half-infinite chain after layers 1, 2, … from a product state (bits)."""
    return _entropies(np.ones(layers + 3), layers)


def window_entropies(layers: int) -> NDArray[np.float64]:
    """The same of what the edge emitted in the last 1, 2, … layers, deep in the bulk of time (bits)."""
    return _entropies(2.0 ** -np.arange(layers + 3.0), layers)


def _entropies(purities: NDArray[np.float64], layers: int) -> NDArray[np.float64]:
    found = np.empty(layers)
    for layer in range(1, layers + 1):
        hopped = 0.5 * (purities[:-2] + purities[2:])  # weight 2/5 each, rescaled by 5/4
        moved = 1.25 * purities
        first = 1 if layer % 2 else 2
        moved[first:-1:2] = hopped[first - 1 :: 2]
        moved[0] = moved[1] / 2
        purities = moved[:-1]  # what the last wall would need has not been followed
        found[layer - 1] = RATE * layer - np.log2(purities[0])
    return found
