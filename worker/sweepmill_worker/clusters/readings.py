"""What is read off a partition: a cluster contributes one bit to the entropy of every region that cuts it."""

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.clusters.state import State
from sweepmill_worker.jit import part, step

Sums = NDArray[np.int64]


@step
def count_sizes(state: State) -> int:
    """Count the sizes; the sum of their squares."""
    label, size = state.label, state.size
    for site in range(len(label)):
        size[site] = 0
    for site in range(len(label)):
        size[label[site]] += np.uint32(1)
    squares = 0
    for site in range(len(label)):
        squares += int(size[site]) * int(size[site])
    return squares


@step
def read_cuts(state: State, out: NDArray[np.int32]) -> None:
    """out[x] = entropy of [0, x), x = 0 .. L: clusters that begin below x and end at x or beyond."""
    last, sites = state.mark, len(state.label)
    out[:] = 0
    for site in range(sites):
        last[state.label[site]] = np.uint32(site)
    for site in range(sites):
        if state.label[site] == site:
            out[site + 1] += 1
            if last[site] + 1 <= sites:
                out[last[site] + 1] -= 1
    for x in range(sites):
        out[x + 1] += out[x]


@step
def read_regions(state: State, ends: Sums, toggles: Sums, out: NDArray[np.int32]) -> None:
    """Entropies of a sequence of regions, site by site: toggle s + 1 adds site s, -(s + 1) removes it.

    Needs counted sizes.  out[i] belongs to the toggles before ends[i].
    """
    label, size, inside = state.label, state.size, state.mark
    inside[:] = 0
    entropy = done = 0
    for region in range(len(ends)):
        for index in range(done, ends[region]):
            toggle = toggles[index]
            cluster = label[abs(toggle) - 1]
            entropy -= 0 < inside[cluster] < size[cluster]
            inside[cluster] += np.uint32(1) if toggle > 0 else np.uint32(0xFFFFFFFF)
            entropy += 0 < inside[cluster] < size[cluster]
        out[region] = entropy
        done = ends[region]


@step
def read_intervals(state: State, periodic: bool, gaps: Sums, spans: Sums, out: Sums) -> None:
    """out[l] = sum of the entropies of all intervals of l sites, l = 0 .. L, in a time linear in L.

    On the ring L intervals of each length, on the open line L - l + 1.  Of the intervals of length l, max(0, g - l)
    fit strictly between neighbors of one cluster at distance g; those miss the cluster, and an interval contributes
    unless it, or its complement, misses it (derived here, tested against single intervals).
    """
    sites = len(state.label)
    gaps[:] = 0
    spans[:] = 0
    clusters = collect_gaps(state, periodic, gaps, spans)
    sum_ramps(gaps)
    sum_ramps(spans)
    for length in range(sites + 1):
        if periodic:
            out[length] = clusters * sites - gaps[length] - gaps[sites - length]
        else:
            out[length] = clusters * (sites - length + 1) - gaps[length] - spans[sites + 1 - length]


@part
def collect_gaps(state: State, periodic: bool, gaps: Sums, spans: Sums) -> int:
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
            gaps[site - int(before[cluster])] += 1
        before[cluster] = np.uint32(site)
    for site in range(sites):
        if label[site] == site:
            close_cluster(site, int(before[site]), sites, periodic, gaps, spans)
    return clusters


@part
def close_cluster(first: int, last: int, sites: int, periodic: bool, gaps: Sums, spans: Sums) -> None:
    """The gap around the ring, or the two to the ends of the line."""
    if periodic:
        gaps[sites - last + first] += 1
        return
    gaps[first + 1] += 1
    gaps[sites - last] += 1
    spans[sites + 1 - (last - first)] += 1
    spans[sites - last] -= 1
    spans[first + 1] -= 1


@part
def sum_ramps(histogram: Sums) -> None:
    """h[l] = sum over g of h[g] max(0, g - l), in place: two sums from above."""
    above = total = 0
    for length in range(len(histogram) - 1, -1, -1):
        here = histogram[length]
        total += above
        above += here
        histogram[length] = total
