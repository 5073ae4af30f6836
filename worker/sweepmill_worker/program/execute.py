"""The loop over trajectories, layers and operations: one call into compiled code per batch."""

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.clifford.classes import Masks
from sweepmill_worker.clifford.commutators import Matrix
from sweepmill_worker.clifford.elimination import Desk as ReadingDesk
from sweepmill_worker.clifford.moves import gate, gate_layer, measure
from sweepmill_worker.clifford.readings import read
from sweepmill_worker.clifford.roads import Plan
from sweepmill_worker.clifford.state import Halves, Lanes, State, erase, insert, reset, write_one_hot
from sweepmill_worker.clifford.trajectories import Results
from sweepmill_worker.clifford.vectors import item, put
from sweepmill_worker.clifford.windows import grow
from sweepmill_worker.jit import entry, part
from sweepmill_worker.program.draw import begin_trajectory, draw_layer
from sweepmill_worker.program.moves import X, Z, gate_on_pair, gate_on_site, single, turn
from sweepmill_worker.program.operations import DEPOLARISE, FORCED, GATE, MEASURE, RECORDED, SWAP_IN
from sweepmill_worker.program.products import Product, dephase, measure_product
from sweepmill_worker.program.roads import BRICKS, SITES, SOME_BRICKS
from sweepmill_worker.program.tables import (
    DETAIL,
    FIRST,
    FLAGS,
    LAYER_LIST,
    PARITY,
    REFERENCE,
    ROAD,
    WIDTH,
    Desk,
    Tables,
)
from sweepmill_worker.program.windows import extend_over

ZEROS, PLUS, MIXED = 0, 1, 2
INITIAL_STATES: Final = {"zeros": ZEROS, "plus": PLUS, "mixed": MIXED}


class Circuit(NamedTuple):
    """What the executor knows besides the tables."""

    layers: int
    initial: int
    loses: bool
    """Has the state logical rows?"""
    ring: bool
    """Do windows wrap?  Only on a ring without references."""
    masks: Masks
    """Of the classes of two-site gates."""
    single_masks: Halves
    """Column masks of the classes of one-site gates."""
    classes: NDArray[np.int64]
    """Room for the classes of a layer of bricks."""
    key: tuple[int, int]


@part
def prepare(state: State, circuit: Circuit, tables: Tables, lanes: Lanes) -> None:
    """The initial state of the chain; references in |0>."""
    reset(state, circuit.initial == MIXED, lanes)
    if circuit.initial == PLUS:
        for site in range(tables.sites):
            turn(state, site, X, lanes)
    if circuit.initial == MIXED:  # row 2q is X of site q, row 2q + 1 is Z
        for site in range(tables.sites, state.sites):
            write_one_hot(state, 2 * site, -1, lanes)
            erase(state.logicals, 2 * site)
            erase(state.logicals, 2 * site + 1)
            insert(state.stabilizers, 2 * site + 1)


@part
def sequence_row(number: int, tables: Tables) -> int:
    """Row of the sequence of a layer."""
    if number <= 0:
        return number + tables.before - 1
    if number <= tables.repeated:
        return tables.before + (number - 1) % tables.span
    return tables.before + tables.span + number - tables.repeated - 1


@part
def bricks(
    state: State, circuit: Circuit, tables: Tables, desk: Desk, top: int, begin: int, end: int, lanes: Lanes
) -> int:
    """A gate on every bond of one parity, save the one across the end of a ring with references; the first not done."""
    parity = tables.steps[top, PARITY]
    done = end - (1 if tables.periodic and parity == 1 and not circuit.ring else 0)
    for row in range(begin, done):
        put(circuit.classes, row - begin, item(desk.details, row) >> 4)
    gate_layer(state, parity, circuit.classes, done - begin, circuit.ring, circuit.masks, lanes)
    return done


@part
def some_bricks(
    state: State, circuit: Circuit, tables: Tables, desk: Desk, top: int, begin: int, end: int, lanes: Lanes
) -> int:
    """Gates on some bonds of one parity; the first operation not done."""
    first = tables.steps[top, FIRST]
    for chunk in range(state.chunks):
        for row in range(begin, end):
            place = first + item(desk.ordinals, row)
            left, right = desk.places[place, 0], desk.places[place, 1]
            gate(state, chunk, left, right, circuit.masks, item(desk.details, row) >> 4, lanes)
    for row in range(begin, end):  # with references no window goes around the ring
        place = first + item(desk.ordinals, row)
        left, right = desk.places[place, 0], desk.places[place, 1]
        if left > right and not circuit.ring:
            extend_over(state, left, right, circuit.ring, lanes)
    if begin < end:
        grow(state, tables.steps[top, PARITY], circuit.ring)
    return end


@part
def measure_sites(state: State, tables: Tables, desk: Desk, top: int, begin: int, end: int, lanes: Lanes) -> int:
    """Measure a letter of some sites; how many outcomes were random?"""
    letter, first, random = tables.steps[top, DETAIL], tables.steps[top, FIRST], 0
    for row in range(begin, end):
        site = desk.places[first + item(desk.ordinals, row), 0]
        if letter != Z:
            turn(state, site, letter, lanes)
        random += measure(state, site, lanes)
        if letter != Z:
            turn(state, site, letter, lanes)
    return random


@part
def product_of(tables: Tables, desk: Desk, row: int) -> Product:
    """The Pauli product of a measurement."""
    step = item(desk.acting, row)
    place = tables.steps[step, FIRST] + item(desk.ordinals, row)
    sites = (desk.places[place, 0], desk.places[place, 1], desk.places[place, 2], desk.places[place, 3])
    return Product(tables.steps[step, WIDTH], sites, item(desk.details, row))


@part
def run_measurement(
    state: State, circuit: Circuit, tables: Tables, desk: Desk, row: int, lanes: Lanes
) -> tuple[int, int]:
    """(random, counted) outcomes."""
    product = product_of(tables, desk, row)
    flags = tables.steps[item(desk.acting, row), FLAGS]
    projected = item(desk.codes, row) != MEASURE  # of a rotated gate
    if flags & RECORDED == 0 and not projected:
        dephase(state, product, circuit.ring, lanes)
        return 0, 0
    random = measure_product(state, product, circuit.ring, lanes)
    counted = int(not projected and flags & FORCED == 0)
    return int(random) * counted, counted


@part
def run_channel(state: State, circuit: Circuit, site: int, resets: bool, lanes: Lanes) -> None:
    """Forget a site's qubit; then, if it resets, |0>."""
    if circuit.loses:
        for letter in (Z, X):
            dephase(state, single(site, letter), circuit.ring, lanes)
    if resets:
        measure_product(state, single(site, Z), circuit.ring, lanes)


@part
def run_operation(
    state: State, circuit: Circuit, tables: Tables, desk: Desk, row: int, lanes: Lanes
) -> tuple[int, int]:
    """(random, counted) outcomes."""
    code, step = item(desk.codes, row), item(desk.acting, row)
    if code & 255 == MEASURE:
        return run_measurement(state, circuit, tables, desk, row, lanes)
    place, chosen = tables.steps[step, FIRST] + item(desk.ordinals, row), item(desk.details, row) >> 4
    one, other, width = desk.places[place, 0], desk.places[place, 1], tables.steps[step, WIDTH]
    if code != GATE:
        for ordinal in range(width):
            run_channel(state, circuit, desk.places[place, ordinal], code != DEPOLARISE, lanes)
    if code == SWAP_IN:
        other, width, chosen = tables.steps[step, REFERENCE] + item(desk.ordinals, row), 2, tables.steps[step, DETAIL]
    if code in (GATE, SWAP_IN):
        if width == 1:
            gate_on_site(state, one, circuit.single_masks, chosen, lanes)
        else:
            gate_on_pair(state, one, other, circuit.masks, chosen, circuit.ring, lanes)
    return 0, 0


@part
def run_layer(
    state: State, circuit: Circuit, tables: Tables, desk: Desk, sequence: int, lanes: Lanes
) -> tuple[int, int]:
    """The steps of a layer that has been drawn; how many outcomes were random, of how many?"""
    random, counted, begin = 0, 0, 0
    layers = tables.sequence[sequence, LAYER_LIST]
    first = tables.lists[layers]
    for ordinal in range(tables.lists[layers + 1] - first):
        top, end = tables.tops[first + ordinal], desk.ends[ordinal]
        if tables.steps[top, ROAD] == BRICKS:
            begin = bricks(state, circuit, tables, desk, top, begin, end, lanes)
        elif tables.steps[top, ROAD] == SOME_BRICKS:
            begin = some_bricks(state, circuit, tables, desk, top, begin, end, lanes)
        elif tables.steps[top, ROAD] == SITES:
            random += measure_sites(state, tables, desk, top, begin, end, lanes)
            counted += end - begin
            begin = end
        for row in range(begin, end):
            more_random, more_counted = run_operation(state, circuit, tables, desk, row, lanes)
            random += more_random
            counted += more_counted
        begin = end
    return random, counted


@entry
def run_trajectories(
    state: State,
    reading: ReadingDesk,
    matrix: Matrix,
    circuit: Circuit,
    tables: Tables,
    desk: Desk,
    plan: Plan,
    read_layers: NDArray[np.int64],
    first: np.uint64,
    results: Results,
    lanes: Lanes,
) -> None:
    """Trajectories first, first + 1, ...; read_layers ascend."""
    for index in range(len(results.random)):
        k, reads = first + np.uint64(index), 0
        prepare(state, circuit, tables, lanes)
        begin_trajectory(tables, desk, k, circuit.key)
        for number in range(1 - tables.before, circuit.layers + 1):
            sequence = sequence_row(number, tables)
            word = number if number > 0 else number - 1 + 2**32
            draw_layer(tables, desk, sequence, number if number > 0 else number + tables.before, word, k, circuit.key)
            random, counted = run_layer(state, circuit, tables, desk, sequence, lanes)
            if number > 0:
                results.random[index, number - 1] = random
                results.measured[index, number - 1] = counted
            if reads < len(read_layers) and read_layers[reads] == number:
                read(state, reading, matrix, plan, results.entropies[index, reads], lanes)
                reads += 1
