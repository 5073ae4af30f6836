"""How deep the sites of a region lie in it."""

import numpy as np
from numpy.typing import NDArray


def distances(region: tuple[int, ...], sites: int, periodic: bool) -> NDArray[np.int64]:
    """Distance of each site of a region [n] from the nearest site outside it, 1 at its boundary.

    Along the ring if periodic; beyond the ends of an open chain there are no sites. Raises ValueError for a region
    that leaves no site outside.
    """
    inside = np.zeros(sites, dtype=bool)
    inside[list(region)] = True
    if inside.all():
        raise ValueError("the region must leave a site outside")
    line = np.tile(inside, 3) if periodic else inside
    places = np.arange(len(line))
    before = np.maximum.accumulate(np.where(line, -len(line), places))
    after = np.minimum.accumulate(np.where(line, 2 * len(line), places)[::-1])[::-1]
    depth: NDArray[np.int64] = np.minimum(places - before, after - places)
    found: NDArray[np.int64] = depth[(sites if periodic else 0) + np.array(region)]
    return found
