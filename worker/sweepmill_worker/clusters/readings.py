"""What is read off a partition: a cluster contributes one bit to the entropy of every region that cuts it."""

import numpy as np

from sweepmill_worker.clusters.intervals import sum_intervals
from sweepmill_worker.clusters.state import State
from sweepmill_worker.clusters.wanted import Depths, Integers, Sets, Wanted
from sweepmill_worker.jit import part, step

ONE = np.uint32(1)


@step
def read(state: State, wanted: Wanted, out: Integers) -> None:
    """The integers of the probes."""
    out[:] = 0
    squares = count_sizes(state)
    if wanted.cluster_order >= 0:
        out[wanted.cluster_order] = squares
    read_arcs(state, wanted.arcs, out)
    read_sets(state, wanted.sets, out)
    read_informations(state, wanted.informations, out)
    if wanted.lengths >= 0:
        count_lengths(state, wanted.lengths, out)
    if wanted.line >= 0:
        sum_intervals(state, False, wanted.line, out)
    if wanted.ring >= 0:
        sum_intervals(state, True, wanted.ring, out)


@part
def count_sizes(state: State) -> int:
    """Count the sizes; the sum of their squares."""
    label, size = state.label, state.size
    size[:] = 0
    for site in range(len(label)):
        size[label[site]] += ONE
    squares = 0
    for site in range(len(label)):
        squares += int(size[site]) * int(size[site])
    return squares


@part
def is_cut(state: State, cluster: np.uint32) -> int:
    """1 if the region, counted in the marks, cuts the cluster."""
    return int(state.mark[cluster] - ONE < state.size[cluster] - ONE)  # unsigned: 0 < mark < size


@part
def put_in(state: State, site: int) -> int:
    """Add a site to the region; the change of its entropy."""
    cluster = state.label[site]
    before = is_cut(state, cluster)
    state.mark[cluster] += ONE
    return is_cut(state, cluster) - before


@part
def take_out(state: State, site: int) -> int:
    """Remove a site from the region; the change of its entropy."""
    cluster = state.label[site]
    before = is_cut(state, cluster)
    state.mark[cluster] -= ONE
    return is_cut(state, cluster) - before


@part
def read_arcs(state: State, arcs: Integers, out: Integers) -> None:
    """A window with its ends moved from each arc to the next; on the way it may hold sites twice, or less than none."""
    state.mark[:] = 0
    sites = len(state.label)
    first = beyond = entropy = 0
    for index in range(len(arcs)):
        while beyond < arcs[index, 0] + arcs[index, 1]:
            entropy += put_in(state, beyond % sites)
            beyond += 1
        while beyond > arcs[index, 0] + arcs[index, 1]:
            beyond -= 1
            entropy += take_out(state, beyond % sites)
        while first < arcs[index, 0]:
            entropy += take_out(state, first)
            first += 1
        while first > arcs[index, 0]:
            first -= 1
            entropy += put_in(state, first)
        out[index] = entropy


@part
def read_sets(state: State, sets: Sets, out: Integers) -> None:
    """Any regions, site by site."""
    state.mark[:] = 0
    entropy = done = 0
    for region in range(len(sets.ends)):
        for index in range(done, sets.ends[region]):
            toggle = sets.toggles[index]
            entropy += put_in(state, toggle - 1) if toggle > 0 else take_out(state, -toggle - 1)
        done = sets.ends[region]
        out[sets.places[region]] = entropy


@part
def read_informations(state: State, depths: Depths, out: Integers) -> None:
    """S_x + S_A - S_(A without x), added to the place of x, for all x in some regions A."""
    done = 0
    for region in range(len(depths.ends)):
        state.mark[:] = 0
        for index in range(done, depths.ends[region]):
            put_in(state, depths.sites[index])
        for index in range(done, depths.ends[region]):
            site = depths.sites[index]
            lost = -take_out(state, site)
            put_in(state, site)
            out[depths.places[index]] += int(state.size[state.label[site]] > 1) + lost
        done = depths.ends[region]


@part
def count_lengths(state: State, begin: int, out: Integers) -> None:
    """Lengths of the generators: ZZ of neighbors in a cluster, and the X of all its sites.

    In this choice exactly two ends of generators, of different Paulis, fall on every site: the clipped gauge.
    """
    label, before = state.label, state.mark
    for site in range(len(label)):
        if label[site] != site:
            out[begin + site - int(before[label[site]])] += 1
        before[label[site]] = np.uint32(site)
    for site in range(len(label)):
        if label[site] == site:
            out[begin + int(before[site]) - site] += 1
