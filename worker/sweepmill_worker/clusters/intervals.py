"""Sums of the entropies of all intervals of each length, in a time linear in L.

Of the intervals of length l, max(0, g - l) fit strictly between neighbors of one cluster at distance g: they miss the
cluster.  An interval has a bit from the cluster unless it, or its complement, misses it.  (Derived here, tested against
single intervals.)
"""

import numpy as np

from sweepmill_worker.clusters.state import State
from sweepmill_worker.clusters.wanted import Integers
from sweepmill_worker.jit import part, step


@step
def sum_intervals(state: State, ring: bool, begin: int, out: Integers) -> None:
    """out[begin + l - 1], l = 1 .. L: on the ring of L intervals, on the open line of L - l + 1."""
    sites, gaps, spans = len(state.label), state.gaps, state.spans
    gaps[:] = 0
    spans[:] = 0
    clusters = collect_gaps(state, ring)
    sum_ramps(gaps)
    sum_ramps(spans)
    for length in range(1, sites + 1):
        if ring:
            out[begin + length - 1] = clusters * sites - gaps[length] - gaps[sites - length]
        else:
            out[begin + length - 1] = clusters * (sites - length + 1) - gaps[length] - spans[sites + 1 - length]


@part
def collect_gaps(state: State, ring: bool) -> int:
    """Histogram the distances of neighbors in a cluster, boundaries included; the number of clusters.

    spans, on the line: ramp(l - (b - a)) - ramp(l - (b + 1)) - ramp(l - (L - a)) intervals of length l contain the
    sites a .. b, where ramp(x) = max(0, x); kept as ramps max(0, g - (L + 1 - l)).
    """
    label, before, sites = state.label, state.mark, len(state.label)
    clusters = 0
    for site in range(sites):
        cluster = label[site]
        if cluster == site:
            clusters += 1
        else:
            state.gaps[site - int(before[cluster])] += 1
        before[cluster] = np.uint32(site)
    for site in range(sites):
        if label[site] == site:
            close_cluster(state, site, int(before[site]), ring)
    return clusters


@part
def close_cluster(state: State, first: int, last: int, ring: bool) -> None:
    """The gap around the ring, or the two to the ends of the line."""
    sites, gaps, spans = len(state.label), state.gaps, state.spans
    if ring:
        gaps[sites - last + first] += 1
        return
    gaps[first + 1] += 1
    gaps[sites - last] += 1
    spans[sites + 1 - (last - first)] += 1
    spans[sites - last] -= 1
    spans[first + 1] -= 1


@part
def sum_ramps(histogram: Integers) -> None:
    """h[l] = sum over g of h[g] max(0, g - l), in place: two sums from above."""
    above = total = 0
    for length in range(len(histogram) - 1, -1, -1):
        here = histogram[length]
        total += above
        above += here
        histogram[length] = total
