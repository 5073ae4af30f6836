"""The law of entanglement in a uniformly random stabilizer state."""

from math import prod

import numpy as np
from numpy.typing import NDArray


def stabilizer_law(a: int, b: int) -> NDArray[np.float64]:
    """P(S = 0 .. a) between a and b >= a sites of a uniformly random stabilizer state.

    Exact entanglement probability distribution of bi-partite randomised stabilizer states, QIC 6, 527 (2006),
    quant-ph/0511119 (from memory; counted again as isotropic subspaces times symplectic matchings).
    """

    def isotropic(n: int, m: int) -> float:
        return float(prod((2 ** (2 * n - i) - 2**i) / (2**m - 2**i) for i in range(m)))

    def symplectic(k: int) -> int:
        return int(2 ** (k * k) * prod(4**i - 1 for i in range(1, k + 1)))

    states = prod(2**i + 1 for i in range(1, a + b + 1))
    return np.array([isotropic(a, a - k) * isotropic(b, b - k) * symplectic(k) / states for k in range(a + 1)])
