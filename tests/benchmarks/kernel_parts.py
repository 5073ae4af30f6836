"""Where the kernel's time goes, and the time its memory traffic would take alone.

Parts are timed separately: the gates of a layer and the random words again and again on the state that a trajectory
left; entropies as the difference with and without reading them; measurements are the rest.

The bound counts cache lines of 64 bytes that are read, changed and written.  A gate does that to four columns in each
chunk that may act there; a measurement reads the windows of the groups of 32 rows that anticommute (two lines each),
writes them once, and changes the columns of the pivot's window in each chunk that has such rows.  A line costs what
xor over an array of the size of the state costs in the same run.
"""

import time
from collections.abc import Callable
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.clifford.engine import MASKS
from sweepmill_worker.clifford.marks import chunks_at
from sweepmill_worker.clifford.moves import gate_layer, measure
from sweepmill_worker.clifford.slots import Census, new_census, tidy
from sweepmill_worker.clifford.state import Lanes, State, aligned, column_chunk, new_state, reset
from sweepmill_worker.clifford.trajectories import Circuit, Supply, bonds_in, draw_classes, draw_measured, new_supply
from sweepmill_worker.clifford.vectors import filled_halves, item, trailing_zeros, without_lowest
from sweepmill_worker.clifford.windows import smallest
from sweepmill_worker.jit import entry
from sweepmill_worker.words import fill

GATES, MEASUREMENTS, LINES = 0, 1, 2


class Parts(NamedTuple):
    """Milliseconds per trajectory."""

    gates: float
    randomness: float
    bound: float


@entry
def trace(
    state: State, circuit: Circuit, supply: Supply, census: Census, totals: NDArray[np.int64], lanes: Lanes
) -> None:
    """One trajectory; totals = gates, measurements, lines of both."""
    reset(state, circuit.mixed, lanes)
    for layer in range(1, circuit.layers + 1):
        fill(supply.words, supply.places, supply.layers, layer, np.uint64(0), circuit.key)
        if census.every and (layer - 1) % census.every == 0:
            tidy(state, census, lanes)
        parity = (layer - 1) & 1
        bonds = bonds_in(state.sites, parity, circuit.periodic)
        draw_classes(supply, 0, bonds)
        gate_layer(state, parity, supply.classes, bonds, circuit.periodic, circuit.masks, lanes)
        totals[0] += bonds
        for bond in range(bonds):
            chunks = chunks_at(state, 2 * bond + parity)
            while chunks != 0:
                chunks = without_lowest(chunks)
                totals[2] += 4
        for index in range(draw_measured(supply, supply.gate_words, state.sites, circuit.threshold)):
            site = item(supply.measured, index)
            pivot = smallest(state, 2 * site, state.stabilizers, state.start, state.end, lanes)
            if pivot < 0:
                continue
            window = np.int64(state.end[pivot]) - np.int64(state.start[pivot]) + 1
            chunks = chunks_at(state, site)
            while chunks != 0:
                groups = filled_halves(column_chunk(state, trailing_zeros(chunks), 2 * site, lanes))
                chunks = without_lowest(chunks)
                totals[2] += 2 * window * (groups != 0)
                while groups != 0:
                    groups = without_lowest(groups)
                    totals[2] += 4
            totals[1] += measure(state, site, lanes)


@entry
def repeat_gates(state: State, circuit: Circuit, supply: Supply, times: int, lanes: Lanes) -> None:
    """Layers of gates on a state whose marks stay as they are."""
    for parity in range(times):
        bonds = bonds_in(state.sites, parity & 1, circuit.periodic)
        gate_layer(state, parity & 1, supply.classes, bonds, circuit.periodic, circuit.masks, lanes)


@entry
def repeat_words(circuit: Circuit, supply: Supply, sites: int, times: int) -> int:
    """Random words and decisions of layers."""
    measured = 0
    for layer in range(times):
        fill(supply.words, supply.places, supply.layers, layer, np.uint64(0), circuit.key)
        for ahead in range(4 * len(supply.places) // supply.layer_words):
            base = ahead * supply.layer_words
            draw_classes(supply, base, sites // 2)
            measured += draw_measured(supply, base + supply.gate_words, sites, circuit.threshold)
    return measured


@entry
def repeat_xor(array: NDArray[np.uint64], times: int) -> None:
    """Read, change and write all of an array."""
    for turn in range(times):
        for at in range(len(array)):
            array[at] ^= np.uint64(turn | 1)


def nanoseconds(call: Callable[..., Any], *arguments: Any) -> float:
    """Least processor time of three calls."""
    times = []
    for _ in range(3):
        begin = time.thread_time_ns()
        call(*arguments)
        times.append(time.thread_time_ns() - begin)
    return float(min(times))


def line_cost(size: int) -> float:
    """ns per line of an array of so many bytes."""
    array = aligned(max(size // 8, 64), np.uint64)
    repeat_xor(array, 1)
    times = max(1, 2**24 // array.nbytes)
    return nanoseconds(repeat_xor, array, times) / times / (array.nbytes / 64)


def parts(sites: int, rate: float) -> Parts:
    """Of an open chain of depth 2L."""
    state, lanes = new_state(sites, mixed=False)
    supply, census = new_supply(sites), new_census(state)
    circuit = Circuit(2 * sites, False, False, int(rate * 2**32), MASKS, (1, 2))
    totals = np.zeros(3, dtype=np.int64)
    trace(state, circuit, supply, census, totals, lanes)
    blocks = ((sites - 1) >> state.block) + 1
    marked = sum((int(marks) & ((1 << blocks) - 1)).bit_count() for marks in state.marks) / blocks / state.chunks
    size = int(state.columns.nbytes * (marked if state.chunks > 1 else 1))
    times = max(2, 2**18 // sites)
    repeat_gates(state, circuit, supply, 1, lanes)
    gates = nanoseconds(repeat_gates, state, circuit, supply, times, lanes) / times * 2 * sites
    repeat_words(circuit, supply, sites, 1)
    at_once = 4 * len(supply.places) // supply.layer_words
    randomness = nanoseconds(repeat_words, circuit, supply, sites, times // at_once) / (times // at_once * at_once)
    width = min(1.0, len(lanes) / 8)  # columns of narrow vectors share lines
    bound = totals[LINES] * width * line_cost(size)
    return Parts(1e-6 * gates, 1e-6 * randomness * 2 * sites, 1e-6 * bound)
