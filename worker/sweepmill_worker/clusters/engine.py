"""Sample trajectories of chains of random ZZ and X measurements on their GHZ clusters."""

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from operator import lt
from typing import Final

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.clifford.engine import Readings
from sweepmill_worker.clusters.state import new_state
from sweepmill_worker.clusters.trajectories import (
    BOND_KIND,
    SITE_KIND,
    Circuit,
    Results,
    new_supply,
    run_batch,
)
from sweepmill_worker.clusters.wanted import wanted
from sweepmill_worker.observables.probes import Probes, Region, of_regions
from sweepmill_worker.words import words

__all__ = [
    "MAX_SITES",
    "ClusterChain",
    "ClusterLayer",
    "ClusterReadings",
    "describe",
    "run_cluster_probes",
    "run_clusters",
    "working_bytes",
]

MAX_SITES: Final = 2**20
"""Sums of squared sizes and of intervals stay far within 64 bits; see `working_bytes`."""
MAX_LAYERS: Final = 2**24


@dataclass(frozen=True)
class ClusterChain:
    """The law of a circuit: per layer ZZ on each bond with probability p, then X on each site with probability 1 - p.

    Bonds (0,1), (1,2), ..., and (L-1,0) when periodic.  The initial state is |+...+>.
    """

    sites: int
    layers: int
    periodic: bool
    bond_threshold: int
    """floor(p * 2**32): 0 .. 2**32."""
    site_threshold: int
    """floor((1 - p) * 2**32)."""

    def __post_init__(self) -> None:
        """Raise ValueError, naming the field, for what the engine cannot do."""
        if not 2 <= self.sites <= MAX_SITES:
            raise ValueError(f"sites: must be 2 .. {MAX_SITES}, got {self.sites}")
        if not 0 <= self.layers <= MAX_LAYERS:
            raise ValueError(f"layers: must be 0 .. {MAX_LAYERS}, got {self.layers}")
        for name in ("bond_threshold", "site_threshold"):
            if not 0 <= getattr(self, name) <= 2**32:
                raise ValueError(f"{name}: must be 0 .. 2**32, got {getattr(self, name)}")


@dataclass(frozen=True)
class ClusterReadings(Readings):
    """What was read off `count` trajectories, in the order of k; 64-bit integers, and counts by kind as well."""

    random_by_kind: NDArray[np.int32]
    """[count, layers, 2]: random outcomes of ZZ and of X."""
    measured_by_kind: NDArray[np.int32]
    """[count, layers, 2]: measurements of ZZ and of X."""


@dataclass(frozen=True)
class ClusterLayer:
    """The measurements of one layer of one trajectory, in order."""

    bonds: tuple[tuple[int, int], ...]
    sites: tuple[int, ...]


def working_bytes(sites: int) -> int:
    """Memory of a batch in bytes, results and regions apart: 14 per site, 16 more where intervals are wanted."""
    return 30 * sites + 40_000


def run_clusters(
    chain: ClusterChain,
    key_words: tuple[int, int],
    first: int,
    count: int,
    read_layers: Sequence[int],
    regions: Sequence[Region],
) -> ClusterReadings:
    """Sample trajectories first .. first + count - 1.

    key_words: the first two 32-bit words of the ensemble key.  read_layers: ascending, 0 excluded.  regions: sorted
    tuples of distinct sites.  Raises ValueError, naming the argument, for anything out of range.
    """
    return run_cluster_probes(chain, key_words, first, count, read_layers, of_regions(chain.sites, regions))


def run_cluster_probes(
    chain: ClusterChain,
    key_words: tuple[int, int],
    first: int,
    count: int,
    read_layers: Sequence[int],
    probes: Probes,
) -> ClusterReadings:
    """`run_clusters` with any probes instead of regions: the last axis of `entropies` is that of their layout.

    Sums over intervals cost a time linear in L, arcs and sets a time for the sites in which each differs from the last.
    """
    _check(chain, key_words, first, count, read_layers, probes)
    results = Results(
        entropies=np.zeros((count, len(read_layers), probes.size), dtype=np.int64),
        random=np.zeros((count, chain.layers, 2), dtype=np.int32),
        measured=np.zeros((count, chain.layers, 2), dtype=np.int32),
    )
    thresholds = np.uint64(chain.bond_threshold), np.uint64(chain.site_threshold)
    run_batch(
        new_state(chain.sites, intervals=probes.line or probes.ring),
        Circuit(chain.layers, chain.periodic, *thresholds, key_words),
        new_supply(chain.sites),
        wanted(probes),
        np.array(read_layers, dtype=np.int64),
        np.uint64(first),
        results,
    )
    return ClusterReadings(
        entropies=results.entropies,
        random=results.random.sum(axis=2, dtype=np.int32),
        measured=results.measured.sum(axis=2, dtype=np.int32),
        random_by_kind=results.random,
        measured_by_kind=results.measured,
    )


def describe(chain: ClusterChain, key_words: tuple[int, int], k: int) -> tuple[ClusterLayer, ...]:
    """The measurements of trajectory k, from the words that `run_clusters` uses."""
    return tuple(_describe_layer(chain, key_words, k, layer) for layer in range(1, chain.layers + 1))


def _describe_layer(chain: ClusterChain, key_words: tuple[int, int], k: int, layer: int) -> ClusterLayer:
    def chosen(kind: int, places: int, threshold: int) -> list[int]:
        drawn = words(key_words, kind, layer, k, places).astype(np.uint64)
        return np.flatnonzero(drawn < np.uint64(threshold)).tolist()

    bonds = chosen(BOND_KIND, chain.sites if chain.periodic else chain.sites - 1, chain.bond_threshold)
    sites = chosen(SITE_KIND, chain.sites, chain.site_threshold)
    return ClusterLayer(tuple((bond, (bond + 1) % chain.sites) for bond in bonds), tuple(sites))


def _check(
    chain: ClusterChain,
    key_words: tuple[int, int],
    first: int,
    count: int,
    read_layers: Sequence[int],
    probes: Probes,
) -> None:
    if not all(0 <= word < 2**32 for word in key_words):
        raise ValueError(f"key_words: must be two 32-bit words, got {key_words}")
    if first < 0 or count < 0 or first + count > 2**64:
        raise ValueError(f"first, count: trajectories are numbered 0 .. 2**64 - 1, got {first}, {count}")
    if any(not 1 <= layer <= chain.layers for layer in read_layers) or any(a >= b for a, b in pairwise(read_layers)):
        raise ValueError(f"read_layers: must ascend within 1 .. {chain.layers}, got {list(read_layers)}")
    if probes.sites != chain.sites:
        raise ValueError(f"probes: must be of a chain of {chain.sites} sites, got {probes.sites}")
    for region in (*probes.sets, *probes.negativities, *(item.region for item in probes.informations)):
        if not all(map(lt, region, region[1:])) or (region and not 0 <= region[0] <= region[-1] < chain.sites):
            raise ValueError(f"probes: sites must ascend within 0 .. {chain.sites - 1}, got {region}")
