"""The loop over trajectories and layers: one call into compiled code per batch."""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.clifford.classes import Masks
from sweepmill_worker.clifford.commutators import Matrix
from sweepmill_worker.clifford.elimination import Desk
from sweepmill_worker.clifford.moves import gate_layer, measure
from sweepmill_worker.clifford.readings import read
from sweepmill_worker.clifford.roads import Plan
from sweepmill_worker.clifford.slots import Census, tidy
from sweepmill_worker.clifford.state import Lanes, State, reset
from sweepmill_worker.clifford.vectors import GROUP, below, item, put, trailing_zeros, without_lowest
from sweepmill_worker.jit import entry, part
from sweepmill_worker.words import GATE, MEASURE, counters, fill

WORDS_AT_ONCE = 512
"""Words of short layers are made for several layers in one call, to fill the vectors of the generator."""


class Circuit(NamedTuple):
    """The law of the circuits, as the kernel reads it."""

    layers: int
    periodic: bool
    mixed: bool
    threshold: int
    masks: Masks
    """Of the gate classes."""
    key: tuple[int, int]


class Supply(NamedTuple):
    """Random words of some consecutive layers: per layer the gates' blocks, then the measurements'."""

    places: NDArray[np.uint32]
    layers: NDArray[np.uint32]
    words: NDArray[np.uint32]
    gate_words: int
    """Words of a layer that belong to gates, unused ones included."""
    layer_words: int
    classes: NDArray[np.int64]
    measured: NDArray[np.int64]


class Results(NamedTuple):
    """Filled by the kernel; shapes as in `engine.Readings`."""

    entropies: NDArray[np.int32]
    random: NDArray[np.int32]
    measured: NDArray[np.int32]


def new_supply(sites: int) -> Supply:
    """Room for the words of one or several layers of a chain."""
    gates = counters(GATE, sites // 2)
    places = np.concatenate([gates, counters(MEASURE, sites)])
    at_once = max(1, WORDS_AT_ONCE // (4 * len(places)))
    return Supply(
        places=np.tile(places, at_once),
        layers=np.repeat(np.arange(at_once, dtype=np.uint32), len(places)),
        words=np.empty(4 * len(places) * at_once + GROUP, dtype=np.uint32),
        gate_words=4 * len(gates),
        layer_words=4 * len(places),
        classes=np.empty(sites // 2 + 1, dtype=np.int64),
        measured=np.empty(sites, dtype=np.int64),
    )


@part
def draw_classes(supply: Supply, base: int, bonds: int) -> None:
    """Gate class of each bond of a layer."""
    for bond in range(bonds):
        word = np.uint64(item(supply.words, base + bond))
        put(supply.classes, bond, np.int64((word * np.uint64(720)) >> np.uint64(32)))


@part
def draw_measured(supply: Supply, base: int, sites: int, threshold: int) -> int:
    """List the measured sites of a layer, those with word < threshold; how many?"""
    count = 0
    if threshold == 0:
        return count
    for first in range(0, sites, GROUP):
        chosen = np.uint64(below(supply.words, base + first, np.uint32(threshold - 1)))
        if sites - first < GROUP:
            chosen &= (np.uint64(1) << np.uint64(sites - first)) - np.uint64(1)
        while chosen != 0:
            put(supply.measured, count, first + trailing_zeros(chosen))
            chosen = without_lowest(chosen)
            count += 1
    return count


@part
def bonds_in(sites: int, parity: int, periodic: bool) -> int:
    """Number of gates of a layer."""
    return sites // 2 if periodic else (sites - parity) // 2


@part
def run_layer(state: State, circuit: Circuit, supply: Supply, parity: int, base: int, lanes: Lanes) -> tuple[int, int]:
    """Gates, then measurements; how many outcomes were random, of how many?"""
    bonds = bonds_in(state.sites, parity, circuit.periodic)
    draw_classes(supply, base, bonds)
    gate_layer(state, parity, supply.classes, bonds, circuit.periodic, circuit.masks, lanes)
    measured = draw_measured(supply, base + supply.gate_words, state.sites, circuit.threshold)
    random = 0
    for index in range(measured):
        random += measure(state, item(supply.measured, index), lanes)
    return random, measured


@entry
def run_batch(
    state: State,
    desk: Desk,
    matrix: Matrix,
    circuit: Circuit,
    supply: Supply,
    census: Census,
    plan: Plan,
    read_layers: NDArray[np.int64],
    first: np.uint64,
    results: Results,
    lanes: Lanes,
) -> None:
    """Trajectories first, first + 1, ...; read_layers ascend."""
    at_once = 4 * len(supply.places) // supply.layer_words
    for index in range(len(results.random)):
        reset(state, circuit.mixed, lanes)
        reads = 0
        for layer in range(1, circuit.layers + 1):
            ahead = (layer - 1) % at_once
            if ahead == 0:
                fill(supply.words, supply.places, supply.layers, layer, first + np.uint64(index), circuit.key)
            base = ahead * supply.layer_words
            if census.every and (layer - 1) % census.every == 0:
                tidy(state, census, lanes)
            random, measured = run_layer(state, circuit, supply, (layer - 1) & 1, base, lanes)
            results.random[index, layer - 1] = random
            results.measured[index, layer - 1] = measured
            if reads < len(read_layers) and read_layers[reads] == layer:
                read(state, desk, matrix, plan, results.entropies[index, reads], lanes)
                reads += 1
