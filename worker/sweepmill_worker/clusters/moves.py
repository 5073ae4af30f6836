"""What happens to the clusters in a layer.

ZZ of two sites of one cluster is known already; of two clusters it is random and merges them.  X of a site that is
alone is known already; else it is random and the site leaves its cluster, the rest of which stays one (Entanglement
transition in the projective transverse field Ising model, PRB 102, 094204 (2020), 2006.09748; derived here from the
stabilizers of GHZ states).
"""

import numpy as np

from sweepmill_worker.clusters.state import NONE, Counts, State
from sweepmill_worker.jit import part, step


@part
def root(label: Counts, site: np.uint32) -> np.uint32:
    """The smallest site of a tree; the path to it is shortened."""
    found: np.uint32 = label[label[site]]  # mostly this is it: a guess without branches
    while label[found] != found:
        found = label[found]
    label[site] = found
    return found


@step
def measure_bonds(state: State, words: Counts, first: int, count: int, threshold: np.uint64) -> tuple[int, int]:
    """ZZ on the chosen of `count` bonds from `first` on, bond b between b and b + 1 on the ring: (random, measured).

    A merged root points to the smaller one; a bond that is not chosen rewrites what is there, to spare a branch.
    """
    label, sites = state.label, len(state.label)
    random = measured = 0
    a = root(label, np.uint32(first))
    for index in range(count):
        right = first + index + 1
        b = root(label, np.uint32(right if right < sites else 0))
        taken = np.uint64(words[index]) < threshold
        low, high = min(a, b), max(a, b)
        label[high] = low if taken else high
        random += int(taken & (a != b))
        measured += int(taken)
        a = low if taken else b
    return random, measured


@step
def settle(state: State) -> None:
    """Point every site at its smallest one and count sizes: parents lie below, so one ascending pass is enough."""
    label, size, mark = state.label, state.size, state.mark
    for site in range(len(label)):
        size[site] = 0
        mark[site] = NONE
    for site in range(len(label)):
        found = label[label[site]]
        label[site] = found
        size[found] += np.uint32(1)


@step
def measure_sites(state: State, words: Counts, first: int, count: int, threshold: np.uint64) -> tuple[int, int]:
    """X on the chosen of `count` sites from `first` on, and new labels for all of them: (random, measured).

    Needs settled labels; over a layer the pieces come in ascending order.  mark[old label] = the first site that
    stays, the new label.
    """
    label, size, mark = state.label, state.size, state.mark
    random = measured = 0
    for index in range(count):
        site = np.uint32(first + index)
        old = label[site]
        taken = np.uint64(words[index]) < threshold
        leaves = taken & (size[old] > 1)
        size[old] -= np.uint32(leaves)
        head = mark[old]
        opens = (not taken) & (head == NONE)
        mark[old] = site if opens else head
        label[site] = site if taken | opens else head
        random += int(leaves)
        measured += int(taken)
    return random, measured
