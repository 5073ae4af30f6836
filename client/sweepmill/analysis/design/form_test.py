"""Where the form is tested: a few places of every size, spread over the window."""

import numpy as np

from sweepmill.analysis.arrays import Vector
from sweepmill.analysis.design.place import Candidates

_ACROSS = (-0.9, -0.45, 0.0, 0.45, 0.9)  # of the window


def form_places(candidates: Candidates, u: Vector, reach: float, sizes: Vector) -> Vector:
    """1 at the places [n] that test the form, 0 at the others, from their scaling variable u [n] and its window.

    The place of every size nearest to some values of u across the window; one that has trajectories already is taken
    where it lies within a quarter of their distance.
    """
    chosen = np.zeros(len(candidates))
    for size in sizes:
        for share in _ACROSS:
            far = np.abs(u - share * reach) / reach
            far[(candidates.size != size) | (np.abs(u) > reach)] = np.inf
            near_old = np.where(candidates.have > 0, far, np.inf)
            best = int(np.argmin(near_old if near_old.min() < 0.2 else far))
            if np.isfinite(far[best]):
                chosen[best] = 1.0
    return chosen
