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
    """Arrays of L unsigned integers, not negative so that indexing needs no care for negative ones."""

    label: Counts
    """Between layers: the smallest site of the cluster of each site.  Within: a forest, parents below children."""
    size: Counts
    """Sites of the cluster with this label, where counted."""
    mark: Counts
    """Work space, one number per label."""


def new_state(sites: int) -> State:
    """Every site for itself: the product of |+>."""
    return State(np.arange(sites, dtype=np.uint32), np.ones(sites, np.uint32), np.zeros(sites, np.uint32))
