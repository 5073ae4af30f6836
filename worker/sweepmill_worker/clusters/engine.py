"""Sample trajectories of chains of random ZZ and X measurements on their GHZ clusters."""

from collections.abc import Sequence
from dataclasses import dataclass
from functools import lru_cache
from itertools import pairwise
from operator import lt
from typing import Final

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.clifford.engine import Readings
from sweepmill_worker.clusters.readings import Sums
from sweepmill_worker.clusters.state import new_state
from sweepmill_worker.clusters.trajectories import (
    BOND_KIND,
    SITE_KIND,
    Circuit,
    Results,
    Wanted,
    new_supply,
    run_batch,
)
from sweepmill_worker.words import words

__all__ = ["MAX_SITES", "ClusterChain", "ClusterLayer", "ClusterReadings", "describe", "run_clusters", "working_bytes"]

Region = tuple[int, ...]

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
    """What was read off `count` trajectories, in the order of k; both kinds of measurements counted together."""

    random_by_kind: NDArray[np.int32]
    """[count, layers, 2]: random outcomes of ZZ and of X."""
    measured_by_kind: NDArray[np.int32]
    """[count, layers, 2]: measurements of ZZ and of X."""
    squares: NDArray[np.int64]
    """[count, reads]: sum of the squared cluster sizes."""
    cuts: NDArray[np.int32]
    """[count, reads, L + 1]: entropies of [0, x) in bits, x = 0 .. L; or of no length, if not wanted."""
    intervals: NDArray[np.int64]
    """[count, reads, L + 1]: summed entropies of all intervals of l = 0 .. L sites (L of them on the ring,
    L - l + 1 on the open line); or of no length, if not wanted."""


@dataclass(frozen=True)
class ClusterLayer:
    """The measurements of one layer of one trajectory, in order."""

    bonds: tuple[tuple[int, int], ...]
    sites: tuple[int, ...]


def working_bytes(sites: int) -> int:
    """Memory of a batch in bytes, its results and regions apart: 14 per site, 16 more where intervals are wanted."""
    return 30 * sites + 40_000


def run_clusters(
    chain: ClusterChain,
    key_words: tuple[int, int],
    first: int,
    count: int,
    read_layers: Sequence[int],
    regions: Sequence[Region],
    cuts: bool = False,
    intervals: bool = False,
) -> ClusterReadings:
    """Sample trajectories first .. first + count - 1.

    key_words: the first two 32-bit words of the ensemble key.  read_layers: ascending, 0 excluded.  regions: sorted
    tuples of distinct sites; a region costs time for the sites in which it differs from one of its like.  cuts,
    intervals: read all of them, in a time linear in L.  Raises ValueError, naming the argument, for anything out of
    range.
    """
    _check(chain, key_words, first, count, read_layers, regions)
    order, ends, toggles = _sequence(tuple(regions))
    results = _new_results(chain, count, len(read_layers), len(regions), cuts, intervals)
    run_batch(
        new_state(chain.sites),
        Circuit(
            chain.layers, chain.periodic, np.uint64(chain.bond_threshold), np.uint64(chain.site_threshold), key_words
        ),
        new_supply(chain.sites),
        Wanted(ends, toggles, cuts, intervals, *_ramps(chain.sites, intervals)),
        np.array(read_layers, dtype=np.int64),
        np.uint64(first),
        results,
    )
    entropies = np.empty_like(results.entropies)
    entropies[:, :, order] = results.entropies
    return ClusterReadings(
        entropies=entropies,
        random=results.random.sum(axis=2, dtype=np.int32),
        measured=results.measured.sum(axis=2, dtype=np.int32),
        random_by_kind=results.random,
        measured_by_kind=results.measured,
        squares=results.squares,
        cuts=results.cuts,
        intervals=results.intervals,
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


def _new_results(chain: ClusterChain, count: int, reads: int, regions: int, cuts: bool, intervals: bool) -> Results:
    cut_width, interval_width = (chain.sites + 1 if wanted else 0 for wanted in (cuts, intervals))
    return Results(
        entropies=np.zeros((count, reads, regions), dtype=np.int32),
        random=np.zeros((count, chain.layers, 2), dtype=np.int32),
        measured=np.zeros((count, chain.layers, 2), dtype=np.int32),
        cuts=np.zeros((count, reads, cut_width), dtype=np.int32),
        intervals=np.zeros((count, reads, interval_width), dtype=np.int64),
        squares=np.zeros((count, reads), dtype=np.int64),
    )


def _ramps(sites: int, wanted: bool) -> tuple[Sums, Sums]:
    size = sites + 2 if wanted else 0
    return np.zeros(size, dtype=np.int64), np.zeros(size, dtype=np.int64)


@lru_cache(maxsize=16)
def _sequence(regions: tuple[Region, ...]) -> tuple[NDArray[np.intp], Sums, Sums]:
    """The order in which regions differ least, and the toggles from one to the next: sites + 1 in, negative out."""
    order = sorted(range(len(regions)), key=lambda i: (len(regions[i]), regions[i]))
    toggles: list[int] = []
    ends, present = [], set[int]()
    for index in order:
        wanted = set(regions[index])
        toggles += [site + 1 for site in sorted(wanted - present)] + [-site - 1 for site in sorted(present - wanted)]
        present = wanted
        ends.append(len(toggles))
    return np.array(order, dtype=np.intp), np.array(ends, dtype=np.int64), np.array(toggles, dtype=np.int64)


def _check(
    chain: ClusterChain,
    key_words: tuple[int, int],
    first: int,
    count: int,
    read_layers: Sequence[int],
    regions: Sequence[Region],
) -> None:
    if not all(0 <= word < 2**32 for word in key_words):
        raise ValueError(f"key_words: must be two 32-bit words, got {key_words}")
    if first < 0 or count < 0 or first + count > 2**64:
        raise ValueError(f"first, count: trajectories are numbered 0 .. 2**64 - 1, got {first}, {count}")
    if any(not 1 <= layer <= chain.layers for layer in read_layers) or any(a >= b for a, b in pairwise(read_layers)):
        raise ValueError(f"read_layers: must ascend within 1 .. {chain.layers}, got {list(read_layers)}")
    for region in regions:
        if not all(map(lt, region, region[1:])) or (region and not 0 <= region[0] <= region[-1] < chain.sites):
            raise ValueError(f"regions: sites must ascend within 0 .. {chain.sites - 1}, got {region}")
