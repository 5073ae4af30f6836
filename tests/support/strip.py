"""The Ising model on a strip of circumference L: L over the correlation length, exactly.

y(L, K) = L/xi = (L/2) sum_{r<L} [g(2r+1) - g(2r)], cosh g(r) = cosh^2(2K)/sinh(2K) - cos(pi r/L), g(0) = 2K + ln tanh K
(Crystal statistics I, Phys. Rev. 65, 117 (1944), from memory; checked in test_ising_strip against numbers from the
transfer matrix). Critical point K = ln(1 + sqrt 2)/2, nu = 1, y = pi/4 there.
"""

import numpy as np
from numpy.typing import NDArray

from sweepmill.analysis import Points

CRITICAL = float(np.log1p(np.sqrt(2)) / 2)


def strip(size: int, coupling: float) -> float:
    r = np.arange(1, 2 * size)
    angles = np.cosh(2 * coupling) ** 2 / np.sinh(2 * coupling) - np.cos(np.pi * r / size)
    g = np.concatenate([[2 * coupling + np.log(np.tanh(coupling))], np.arccosh(angles)])
    return float(size / 2 * (g[1::2].sum() - g[0::2].sum()))


def strips(sizes: tuple[int, ...], reach: float, noise: float, seed: int | None = None, count: int = 13) -> Points:
    """Points at K = K_c + u/L for `count` values of u up to `reach`, with Gaussian noise if there is a seed."""
    column: NDArray[np.float64] = np.repeat(np.array(sizes, dtype=np.float64), count)
    couplings = CRITICAL + np.tile(np.linspace(-reach, reach, count), len(sizes)) / column
    means = np.array([strip(int(size), k) for size, k in zip(column, couplings, strict=True)])
    if seed is not None:
        means = means + noise * np.random.default_rng(seed).standard_normal(len(means))
    return Points.of(column, couplings, means, noise)
