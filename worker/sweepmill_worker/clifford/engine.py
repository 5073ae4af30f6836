"""Sample trajectories of brickwork Clifford circuits with projective Z measurements, without signs."""

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from operator import lt
from typing import Final

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.clifford.classes import GATE_CLASSES, column_masks
from sweepmill_worker.clifford.commutators import new_matrix
from sweepmill_worker.clifford.elimination import new_desk
from sweepmill_worker.clifford.roads import Plan, plan
from sweepmill_worker.clifford.slots import new_census
from sweepmill_worker.clifford.state import STEP, lanes_for, new_state
from sweepmill_worker.clifford.trajectories import Circuit, Results, new_supply, run_batch
from sweepmill_worker.observables.probes import Probes, Region, of_regions
from sweepmill_worker.words import GATE, MEASURE, words

__all__ = [
    "GATE_CLASSES",
    "MAX_LAYERS",
    "MAX_SITES",
    "HybridChain",
    "Layer",
    "Readings",
    "describe",
    "run",
    "run_probes",
    "working_bytes",
]

MAX_SITES: Final = 4096
"""A bound of what is tested: windows of 16 bits would bear 16,383 sites."""
MAX_LAYERS: Final = 2**24
"""Far beyond any ensemble; layers are 32-bit counters of the random words."""

MASKS = column_masks()


@dataclass(frozen=True)
class HybridChain:
    """The law of a circuit: brickwork of uniform two-qubit Cliffords, then Z on each site with probability p.

    Odd layers act on (0,1), (2,3), ...; even layers on (1,2), (3,4), ... and on (L-1,0) when periodic.  The initial
    state is |0...0>, or maximally mixed.
    """

    sites: int
    layers: int
    periodic: bool
    mixed: bool
    threshold: int
    """floor(p * 2**32): 0 .. 2**32."""

    def __post_init__(self) -> None:
        """Raise ValueError, naming the field, for what the engine cannot do."""
        if not 2 <= self.sites <= MAX_SITES:
            raise ValueError(f"sites: must be 2 .. {MAX_SITES}, got {self.sites}")
        if not 0 <= self.layers <= MAX_LAYERS:
            raise ValueError(f"layers: must be 0 .. {MAX_LAYERS}, got {self.layers}")
        if self.periodic and self.sites % 2:
            raise ValueError(f"sites: periodic brickwork needs an even number of sites, got {self.sites}")
        if not 0 <= self.threshold <= 2**32:
            raise ValueError(f"threshold: must be 0 .. 2**32, got {self.threshold}")


@dataclass(frozen=True)
class Readings:
    """What was read off `count` trajectories, in the order of k."""

    entropies: NDArray[np.signedinteger]
    """[count, reads, regions], in bits, after the measurements of the layer; or the integers of other probes."""
    random: NDArray[np.int32]
    """[count, layers]: outcomes with Born probability 1/2."""
    measured: NDArray[np.int32]
    """[count, layers]: measurements."""


@dataclass(frozen=True)
class Layer:
    """One layer of one trajectory."""

    gates: tuple[tuple[int, int, int], ...]
    """(left site, right site, class in GATE_CLASSES)."""
    measured: tuple[int, ...]


def run(
    chain: HybridChain,
    key_words: tuple[int, int],
    first: int,
    count: int,
    read_layers: Sequence[int],
    regions: Sequence[Region],
) -> Readings:
    """Sample trajectories first .. first + count - 1.

    key_words: the first two 32-bit words of the ensemble key.  read_layers: ascending, 0 excluded.  regions: sorted
    tuples of distinct sites.  Raises ValueError, naming the argument, for anything out of range.
    """
    _check(chain, key_words, first, count, read_layers, regions)
    return run_probes(chain, key_words, first, count, read_layers, of_regions(chain.sites, regions))


def run_probes(
    chain: HybridChain, key_words: tuple[int, int], first: int, count: int, read_layers: Sequence[int], probes: Probes
) -> Readings:
    """`run` with any probes instead of regions: the last axis of `entropies` is that of their layout."""
    return run_plan(chain, key_words, first, count, read_layers, plan(probes, chain.mixed))


def run_plan(
    chain: HybridChain,
    key_words: tuple[int, int],
    first: int,
    count: int,
    read_layers: Sequence[int],
    chosen: Plan,
    sorting: bool = True,
) -> Readings:
    """`run` with the roads already chosen and nothing checked.

    Without sorting of the slots (see `slots`) the numbers are the same.
    """
    state, lanes = new_state(chain.sites, chain.mixed)
    spare, _ = new_state(chain.sites, chain.mixed)
    results = Results(
        entropies=np.zeros((count, len(read_layers), chosen.size), dtype=np.int32),
        random=np.zeros((count, chain.layers), dtype=np.int32),
        measured=np.zeros((count, chain.layers), dtype=np.int32),
    )
    run_batch(
        state,
        new_desk(spare),
        new_matrix(state, lanes, wanted=len(chosen.others.ends) + len(chosen.negativities.ends) > 0),
        Circuit(chain.layers, chain.periodic, chain.mixed, chain.threshold, MASKS, key_words),
        new_supply(chain.sites),
        new_census(state, sorting),
        chosen,
        np.array(read_layers, dtype=np.int64),
        np.uint64(first),
        results,
        lanes,
    )
    return Readings(*results)


def working_bytes(sites: int, mixed: bool) -> int:
    """A bound on the memory that `run` needs at a time, besides the results and the plan; it grows as L**2.

    Columns of the state and of its copy for readings, and two matrices of commutators (only asked-for regions that are
    no intervals need them); then what is kept per slot and per site.
    """
    rows = 2 * sites if mixed else sites
    lanes = lanes_for(rows)
    slots = -(-rows // (64 * lanes)) * 64 * lanes
    columns, commutators = slots * (2 * sites + STEP) // 8, slots * slots // 8
    return 2 * columns + 2 * commutators + 64 * slots + 64 * sites + 32_768


def describe(chain: HybridChain, key_words: tuple[int, int], k: int) -> tuple[Layer, ...]:
    """The circuit of trajectory k, from the words that `run` uses."""
    return tuple(_describe_layer(chain, key_words, k, layer) for layer in range(1, chain.layers + 1))


def _describe_layer(chain: HybridChain, key_words: tuple[int, int], k: int, layer: int) -> Layer:
    parity = (layer - 1) % 2
    lefts = [s for s in range(parity, chain.sites, 2) if chain.periodic or s + 1 < chain.sites]
    classes = (words(key_words, GATE, layer, k, len(lefts)).astype(np.uint64) * np.uint64(720)) >> np.uint64(32)
    chosen = words(key_words, MEASURE, layer, k, chain.sites).astype(np.uint64) < np.uint64(chain.threshold)
    return Layer(
        gates=tuple((s, (s + 1) % chain.sites, int(c)) for s, c in zip(lefts, classes, strict=True)),
        measured=tuple(np.flatnonzero(chosen).tolist()),
    )


def _check(
    chain: HybridChain,
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
    if any(not 1 <= layer <= chain.layers for layer in read_layers):
        raise ValueError(f"read_layers: layers are 1 .. {chain.layers}, got {list(read_layers)}")
    if any(a >= b for a, b in pairwise(read_layers)):
        raise ValueError(f"read_layers: must ascend, got {list(read_layers)}")
    for region in regions:
        if not all(map(lt, region, region[1:])):
            raise ValueError(f"regions: sites must ascend, got {region}")
        if region and not 0 <= region[0] <= region[-1] < chain.sites:
            raise ValueError(f"regions: sites are 0 .. {chain.sites - 1}, got {region}")
