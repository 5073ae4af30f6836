"""The cluster engine against connected components of scipy: `python tests/benchmarks/bench_clusters.py [--quick]`.

Ring at p = 1/2, one core, random words and outcome counts included.  The alternative is the shortest way to the same
partitions with a general library: per step the measured bonds are a sparse graph on the clusters, scipy labels its
components, and numpy gives sites measured in X labels of their own (outcome counts left out).  Both take turns within
one run; figures are medians of processor time.
"""

import argparse
import time
from collections.abc import Callable
from functools import partial
from statistics import median

import numpy as np
from numpy.typing import NDArray
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from sweepmill_worker.clusters.engine import ClusterChain, run_cluster_probes, working_bytes
from sweepmill_worker.observables.probes import Probes

KEY = (0x5EED5EED, 0x0B5E55ED)
ROUNDS = 5
HALF = 2**31


def timed(call: Callable[[], object]) -> float:
    """Processor time of this thread, s."""
    begin = time.thread_time()
    call()
    return time.thread_time() - begin


def by_components(sites: int, steps: int, draw: np.random.Generator) -> NDArray[np.int64]:
    """Labels of the clusters after some steps."""
    labels = np.arange(sites)
    for _ in range(steps):
        bonds = np.flatnonzero(draw.random(sites) < 0.5)
        ends = labels[bonds], labels[(bonds + 1) % sites]
        graph = coo_array((np.ones(len(bonds), dtype=np.int8), ends), shape=(sites, sites))
        _, components = connected_components(graph, directed=False)
        labels = components[labels].astype(np.int64)
        alone = np.flatnonzero(draw.random(sites) < 0.5)
        labels[alone] = sites + alone
        labels = np.unique(labels, return_inverse=True)[1]
    return labels


def compare(sites: int) -> tuple[float, float]:
    """Million site-steps per second of either way."""
    steps = max(8, 1_000_000 // sites)
    slow = max(4, steps // 8)
    chain = ClusterChain(sites, steps, periodic=True, bond_threshold=HALF, site_threshold=HALF)
    draw = np.random.default_rng(1)
    probes = Probes(sites, arcs=np.array([(0, sites // 2)]), cluster_order=True)
    ours, theirs = [], []
    for turn in range(ROUNDS):
        ours.append(sites * steps / timed(partial(run_cluster_probes, chain, KEY, turn, 1, [steps], probes)) / 1e6)
        theirs.append(sites * slow / timed(partial(by_components, sites, slow, draw)) / 1e6)
    return median(ours), median(theirs)


def main() -> None:
    """Print the table."""
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0] if __doc__ else None)
    parser.add_argument("--quick", action="store_true", help="leave out a million sites")
    sizes = [1000, 10_000, 100_000] if parser.parse_args().quick else [1000, 10_000, 100_000, 1_000_000]
    run_cluster_probes(ClusterChain(8, 1, True, HALF, HALF), KEY, 0, 1, [], Probes(8, arcs=np.array([(0, 4)])))
    print(f"{'sites':>8} {'engine':>10} {'scipy':>10} {'ratio':>6} {'memory':>10}   million site-steps per second; MB")
    for sites in sizes:
        ours, theirs = compare(sites)
        memory = working_bytes(sites) / 1e6
        print(f"{sites:>8} {ours:>10.1f} {theirs:>10.2f} {ours / theirs:>6.1f} {memory:>10.2f}", flush=True)


if __name__ == "__main__":
    main()
