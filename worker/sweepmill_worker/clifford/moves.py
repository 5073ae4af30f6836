"""What happens to a state: a layer of gates, and the measurement of Z on a site."""

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.clifford.classes import Masks
from sweepmill_worker.clifford.marks import chunks_at, mark, run_length
from sweepmill_worker.clifford.state import (
    STEP,
    Lanes,
    State,
    Words,
    address,
    bit_of,
    column_chunk,
    erase,
    insert,
    rows_per_chunk,
    write_chunk,
)
from sweepmill_worker.clifford.vectors import (
    Value,
    any_bit,
    choose,
    item,
    load,
    nonzero,
    one_hot,
    splat,
    store,
    trailing_zeros,
    without_lowest,
)
from sweepmill_worker.clifford.windows import grow, smallest, unite
from sweepmill_worker.jit import part


@part
def image(
    patterns: Words, at: int, x_left: Value, z_left: Value, x_right: Value, z_right: Value, lanes: Lanes
) -> Value:
    """One new column of a gate: the sum of the old ones in the pattern that starts at `at`."""
    return (
        (x_left & splat(item(patterns, at), lanes))
        ^ (z_left & splat(item(patterns, at + 1), lanes))
        ^ (x_right & splat(item(patterns, at + 2), lanes))
        ^ (z_right & splat(item(patterns, at + 3), lanes))
    )


@part
def gate(state: State, chunk: int, left: int, right: int, masks: Masks, chosen: int, lanes: Lanes) -> None:
    """Apply a class to two sites: a 4 x 4 map of four columns, free of branches."""
    to_left = address(state, chunk, 2 * left, lanes)
    to_right = address(state, chunk, 2 * right, lanes)
    a, b = load(state.columns, to_left, lanes), load(state.columns, to_left + len(lanes), lanes)
    c, d = load(state.columns, to_right, lanes), load(state.columns, to_right + len(lanes), lanes)
    code = int(np.int64(item(masks.codes, chosen)))
    x_left = image(masks.patterns, code & 255, a, b, c, d, lanes)
    z_left = image(masks.patterns, code >> 8 & 255, a, b, c, d, lanes)
    x_right = image(masks.patterns, code >> 16 & 255, a, b, c, d, lanes)
    z_right = image(masks.patterns, code >> 24, a, b, c, d, lanes)
    store(state.columns, to_left, x_left)
    store(state.columns, to_left + len(lanes), z_left)
    store(state.columns, to_right, x_right)
    store(state.columns, to_right + len(lanes), z_right)


@part
def gate_layer(
    state: State, parity: int, classes: NDArray[np.int64], bonds: int, periodic: bool, masks: Masks, lanes: Lanes
) -> None:
    """Apply gates to the bonds (parity, parity + 1), (parity + 2, parity + 3), ...; of each chunk, where it may act."""
    for chunk in range(state.chunks):
        blocks = item(state.marks, chunk)
        while blocks != 0:
            first = trailing_zeros(blocks)
            beyond = first + run_length(blocks >> np.uint64(first))
            blocks &= blocks + (np.uint64(1) << np.uint64(first))
            for bond in range(first << (state.block - 1), min(beyond << (state.block - 1), bonds)):
                left = 2 * bond + parity
                right = left + 1 if left + 1 < state.sites else 0
                gate(state, chunk, left, right, masks, item(classes, bond), lanes)
    grow(state, parity, periodic)


@part
def measure(state: State, site: int, lanes: Lanes) -> bool:
    """Measure Z of a site; was the outcome random?

    Rows that anticommute with Z have a bit in the X column.  A stabilizer among them: random, the rank stays.  Only
    logical rows: Z is new information, random, and the rank of the group grows.  None: Z is in the group already.
    """
    column = 2 * site
    pivot = smallest(state, column, state.stabilizers, state.start, state.end, lanes)
    if pivot >= 0:
        replace(state, site, pivot, lanes)
        return True
    pivot = smallest(state, column, state.logicals, state.start, state.end, lanes)
    if pivot >= 0:
        replace(state, site, pivot, lanes)
        promote(state, pivot, lanes)
        return True
    return False


@part
def replace(state: State, site: int, pivot: int, lanes: Lanes) -> None:
    """Multiply the pivot into all anticommuting rows, itself included, and put Z of the site in its slot.

    The pivot is the anticommuting row with the shortest window: that alone keeps rows short, and no gauge has to
    be maintained between measurements.
    """
    start, end, home = item(state.start, pivot), item(state.end, pivot), pivot // rows_per_chunk(lanes)
    unite(state, site, pivot, lanes)
    others = chunks_at(state, site) & ~(np.uint64(1) << np.uint64(home))
    while others != 0:
        chunk = trailing_zeros(others)
        others = without_lowest(others)
        multiply(state, chunk, site, start, end, pivot, lanes)
        write_site(state, chunk, site, -1, lanes)
    multiply(state, home, site, start, end, pivot, lanes)  # last: erases the pivot's bits
    write_site(state, home, site, pivot, lanes)


@part
def multiply(state: State, chunk: int, site: int, start: int, end: int, pivot: int, lanes: Lanes) -> None:
    """One chunk of: rows in the X column of the site ^= pivot row, over the pivot's window."""
    rows = column_chunk(state, chunk, 2 * site, lanes)
    if state.chunks > 1:
        if not any_bit(rows):
            return
        mark(state, chunk, start, end)
    add_over_window(state, chunk, rows, start, end, pivot, lanes)


@part
def add_over_window(state: State, chunk: int, rows: Value, start: int, end: int, pivot: int, lanes: Lanes) -> None:
    """Multiply the pivot, whose window is start .. end modulo L, into some rows of a chunk."""
    if end - start + 1 == state.sites:  # from site 0, lest the steps of the second part reach into the first
        start, end = 0, state.sites - 1
    add_pivot(state, chunk, rows, 2 * start, 2 * min(end + 1, state.sites), pivot, lanes)
    add_pivot(state, chunk, rows, 0, 2 * (end + 1 - state.sites), pivot, lanes)


@part
def write_site(state: State, chunk: int, site: int, row: int, lanes: Lanes) -> None:
    """Columns of a measured site: X is empty, Z has the single bit `row` (nothing if row < 0)."""
    write_chunk(state, chunk, 2 * site, -1, lanes)
    write_chunk(state, chunk, 2 * site + 1, row, lanes)


@part
def add_pivot(state: State, chunk: int, rows: Value, first: int, beyond: int, pivot: int, lanes: Lanes) -> None:
    """Add `rows` to the columns first .. beyond - 1 that have the pivot's bit, and maybe to those of one more site.

    Columns are taken four at a time, which spares the processor most surprises about the end of the loop.  A site
    beyond must be empty for the pivot; or a spare one, which nobody reads.
    """
    bit, nothing = bit_of(state, pivot, lanes), splat(np.uint64(0), lanes)
    to = address(state, chunk, 0, lanes)
    source = address(state, pivot // rows_per_chunk(lanes), 0, lanes) + ((pivot >> 6) & (len(lanes) - 1))
    for begin in range(first, beyond, STEP):
        for column in range(begin, begin + STEP):
            here = to + column * len(lanes)
            word = splat(item(state.columns, source + column * len(lanes)), lanes)
            selected = choose(nonzero(word & bit), rows, nothing)
            store(state.columns, here, load(state.columns, here, lanes) ^ selected)


@part
def promote(state: State, pivot: int, lanes: Lanes) -> None:
    """The pivot was logical: its slot now holds a stabilizer, and its partner leaves.

    The other pairs, multiplied by the pivot where they anticommuted, are the logical rows of the larger group.
    """
    partner = state.partner[pivot]
    erase(state.logicals, pivot)
    erase(state.logicals, partner)
    insert(state.stabilizers, pivot)
    chunk = partner // rows_per_chunk(lanes)
    bit = one_hot(partner - chunk * rows_per_chunk(lanes), lanes)
    for position in range(state.start[partner], state.end[partner] + 1):
        site = position % state.sites
        for column in (2 * site, 2 * site + 1):
            kept = column_chunk(state, chunk, column, lanes)
            store(state.columns, address(state, chunk, column, lanes), kept ^ (kept & bit))
    state.end[partner] = state.start[partner]
    erase(state.wrapping, partner)
