"""The loop over trajectories and layers: one call into compiled code per batch."""

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.clusters.moves import measure_bonds, measure_sites, settle
from sweepmill_worker.clusters.readings import read
from sweepmill_worker.clusters.state import Counts, State
from sweepmill_worker.clusters.wanted import Integers, Wanted
from sweepmill_worker.jit import entry, step
from sweepmill_worker.words import counters, fill

AT_ONCE: Final = 4096
"""Places whose words are made in one call; a multiple of 4."""
BOND_KIND: Final = 1
SITE_KIND: Final = 2


class Circuit(NamedTuple):
    """The law of the circuits, as the kernel reads it."""

    layers: int
    periodic: bool
    bond_threshold: np.uint64
    site_threshold: np.uint64
    key: tuple[int, int]


class Supply(NamedTuple):
    """Random words of a stretch of places of one layer."""

    bonds: Counts
    """First counter words of all blocks of bonds."""
    sites: Counts
    zeros: Counts
    words: Counts


class Results(NamedTuple):
    """Filled by the kernel; shapes as in `engine.ClusterReadings`."""

    entropies: Integers
    random: NDArray[np.int32]
    measured: NDArray[np.int32]


def new_supply(sites: int) -> Supply:
    """Room for the words of a stretch, and the counters of all blocks."""
    return Supply(
        counters(BOND_KIND, sites),
        counters(SITE_KIND, sites),
        np.zeros(AT_ONCE // 4, dtype=np.uint32),
        np.empty(AT_ONCE, dtype=np.uint32),
    )


@step
def draw(
    supply: Supply, blocks: Counts, first: int, count: int, layer: int, k: np.uint64, key: tuple[int, int]
) -> None:
    """The words of places first .. first + count - 1 of a layer."""
    begin, number = first // 4, (count + 3) // 4
    fill(supply.words, blocks[begin : begin + number], supply.zeros, layer, k, key)


@step
def run_layer(state: State, circuit: Circuit, supply: Supply, layer: int, k: np.uint64) -> tuple[int, int, int, int]:
    """ZZ on bonds, then X on sites: (random, measured) of both."""
    sites = len(state.label)
    bonds = sites if circuit.periodic else sites - 1
    random_zz = zz = random_x = x = 0
    for first in range(0, bonds, AT_ONCE):
        count = min(AT_ONCE, bonds - first)
        draw(supply, supply.bonds, first, count, layer, k, circuit.key)
        more, taken = measure_bonds(state, supply.words, first, count, circuit.bond_threshold)
        random_zz += more
        zz += taken
    settle(state)
    for first in range(0, sites, AT_ONCE):
        count = min(AT_ONCE, sites - first)
        draw(supply, supply.sites, first, count, layer, k, circuit.key)
        more, taken = measure_sites(state, supply.words, first, count, circuit.site_threshold)
        random_x += more
        x += taken
    return random_zz, zz, random_x, x


@entry
def run_batch(
    state: State,
    circuit: Circuit,
    supply: Supply,
    wanted: Wanted,
    read_layers: NDArray[np.int64],
    first: np.uint64,
    results: Results,
) -> None:
    """Trajectories first, first + 1, ...; read_layers ascend."""
    for index in range(len(results.random)):
        for site in range(len(state.label)):
            state.label[site] = site
        reads = 0
        for layer in range(1, circuit.layers + 1):
            counted = run_layer(state, circuit, supply, layer, first + np.uint64(index))
            results.random[index, layer - 1, 0], results.measured[index, layer - 1, 0] = counted[0], counted[1]
            results.random[index, layer - 1, 1], results.measured[index, layer - 1, 1] = counted[2], counted[3]
            if reads < len(read_layers) and read_layers[reads] == layer:
                read(state, wanted, results.entropies[index, reads])
                reads += 1
