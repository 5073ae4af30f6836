"""The state of a chain that is a product of GHZ states: which sites form a cluster.

Signs are dropped, so a partition of the sites is the whole state: a cluster of n sites is stabilized by ZZ of any two
of its sites and by the product of X over all of them (textbook GHZ state).
"""

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import NDArray

Counts = NDArray[np.uint32]
NONE: Final = np.uint32(0xFFFFFFFF)


class State(NamedTuple):
    """Arrays of L unsigned integers: indices that cannot be negative need no care for it."""

    label: Counts
    """Between layers: the smallest site of the cluster of each site.  Within: a forest, parents below children."""
    size: Counts
    """Sites of the cluster with this label, where counted."""
    mark: Counts
    """Work space, one number per label."""
    gaps: NDArray[np.int64]
    """Work space for sums over intervals: L + 2 numbers, or none."""
    spans: NDArray[np.int64]


def new_state(sites: int, intervals: bool) -> State:
    """Every site for itself: the product of |+>."""
    label, size, mark = np.arange(sites, dtype=np.uint32), np.ones(sites, np.uint32), np.zeros(sites, np.uint32)
    gaps, spans = (np.zeros(sites + 2 if intervals else 0, dtype=np.int64) for _ in range(2))
    return State(label, size, mark, gaps, spans)
