"""The road for any region: S(A) = half the rank of the rows' commutators restricted to A.

The matrix M of commutators on A is the sum over the sites q of A of x_q z_q^T + z_q x_q^T, where x_q and z_q are the
columns of q over all rows.  Rows inside A or outside A drop out by themselves, so M has as many non-zero rows as cross
the boundary of A; and the next region costs only the sites in which it differs from the last.  That makes averages
over translations of two-interval regions cheap.  Source of the formula: rank of commutation matrices, as in
Entanglement in the stabilizer formalism, quant-ph/0406168 (from memory); the sum over sites is derived here.
"""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.clifford.state import Lanes, State, Words, address, aligned, column_chunk, rows_per_chunk
from sweepmill_worker.clifford.vectors import any_bit, item, load, splat, store, trailing_zeros
from sweepmill_worker.jit import part


class Matrix(NamedTuple):
    """Commutators as rows of words, chunk after chunk, and room for the rows of an elimination."""

    rows: Words
    scratch: Words
    owners: NDArray[np.int32]
    """Per row of the scratch space, the row of the group it belongs to."""
    homes: NDArray[np.int32]
    """The inverse, where there is one."""


def new_matrix(state: State, lanes: Lanes, wanted: bool) -> Matrix:
    """Room for the commutators of all rows (nothing if not wanted)."""
    size = len(state.start) * state.chunks * len(lanes) if wanted else 0
    slots = len(state.start) if wanted else 0
    owners, homes = np.zeros(slots, dtype=np.int32), np.zeros(slots, dtype=np.int32)
    return Matrix(aligned(size, np.uint64), aligned(size, np.uint64), owners, homes)


@part
def toggle(state: State, matrix: Matrix, site: int, lanes: Lanes) -> None:
    """Add the site to the region, or remove it if it is there."""
    add_outer(state, matrix, 2 * site, 2 * site + 1, lanes)
    add_outer(state, matrix, 2 * site + 1, 2 * site, lanes)


@part
def add_outer(state: State, matrix: Matrix, of: int, added: int, lanes: Lanes) -> None:
    """Add column `added`, as a row vector, to the matrix row of every row in column `of`."""
    for chunk in range(state.chunks):
        base = address(state, chunk, of, lanes)
        for word in range(len(lanes)):
            bits = item(state.columns, base + word)
            while bits != 0:
                row = chunk * rows_per_chunk(lanes) + 64 * word + trailing_zeros(bits)
                bits &= bits - np.uint64(1)
                add_column(state, matrix, row, added, lanes)


@part
def add_column(state: State, matrix: Matrix, row: int, column: int, lanes: Lanes) -> None:
    """Matrix row ^= column."""
    for chunk in range(state.chunks):
        at = (row * state.chunks + chunk) * len(lanes)
        value = load(matrix.rows, at, lanes) ^ column_chunk(state, chunk, column, lanes)
        store(matrix.rows, at, value)


@part
def half_rank(state: State, matrix: Matrix, lanes: Lanes) -> int:
    """Half the rank of the matrix: the entropy of the region in bits.

    Rows leave in pairs that do not commute, once their parts are removed from all others: then these have no bits left
    at the places of the pair, and the matrix remains one of commutators.
    """
    width = state.chunks * len(lanes)
    remaining = gather(state, matrix, lanes)
    pairs = 0
    while remaining > 0:
        remaining -= 1
        word = 0
        while word < width and item(matrix.scratch, remaining * width + word) == 0:
            word += 1
        if word == width:
            continue
        partner = 64 * word + trailing_zeros(item(matrix.scratch, remaining * width + word))
        remaining -= 1
        move_to(state, matrix, partner, remaining, lanes)
        remove_pair(state, matrix, remaining, lanes)
        pairs += 1
    return pairs


@part
def gather(state: State, matrix: Matrix, lanes: Lanes) -> int:
    """Copy the non-zero rows to the scratch space; how many?"""
    found = 0
    for row in range(len(state.start)):
        kept = False
        for chunk in range(state.chunks):
            value = load(matrix.rows, (row * state.chunks + chunk) * len(lanes), lanes)
            store(matrix.scratch, (found * state.chunks + chunk) * len(lanes), value)
            kept |= any_bit(value)
        matrix.owners[found] = row
        matrix.homes[row] = found
        found += kept
    return found


@part
def move_to(state: State, matrix: Matrix, row: int, place: int, lanes: Lanes) -> None:
    """Put the scratch row of a row of the group in the given place, and the one that was there in its stead."""
    old, other = matrix.homes[row], matrix.owners[place]
    for chunk in range(state.chunks):
        here, there = (place * state.chunks + chunk) * len(lanes), (old * state.chunks + chunk) * len(lanes)
        value = load(matrix.scratch, here, lanes)
        store(matrix.scratch, here, load(matrix.scratch, there, lanes))
        store(matrix.scratch, there, value)
    matrix.owners[place], matrix.owners[old] = row, other
    matrix.homes[row], matrix.homes[other] = place, old


@part
def remove_pair(state: State, matrix: Matrix, place: int, lanes: Lanes) -> None:
    """Remove from the scratch rows before `place` their parts along the two that begin there, a and b.

    A row that anticommutes with a is multiplied by b, and one that anticommutes with b by a.
    """
    width = state.chunks * len(lanes)
    of_a, of_b = matrix.owners[place], matrix.owners[place + 1]
    for other in range(place):
        with_a = splat(bit_mask(item(matrix.scratch, other * width + (of_a >> 6)), of_a), lanes)
        with_b = splat(bit_mask(item(matrix.scratch, other * width + (of_b >> 6)), of_b), lanes)
        for chunk in range(state.chunks):
            to = other * width + chunk * len(lanes)
            a = load(matrix.scratch, place * width + chunk * len(lanes), lanes)
            b = load(matrix.scratch, (place + 1) * width + chunk * len(lanes), lanes)
            store(matrix.scratch, to, load(matrix.scratch, to, lanes) ^ (a & with_b) ^ (b & with_a))


@part
def bit_mask(word: np.uint64, place: int) -> np.uint64:
    """All bits if the bit at place % 64 is set, else none."""
    return np.uint64(0) - ((word >> np.uint64(place & 63)) & np.uint64(1))
