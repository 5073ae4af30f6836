"""The road for any region: S(A) = half the rank of the rows' commutators restricted to A.

The matrix M of commutators on A is the sum over the sites q of A of x_q z_q^T + z_q x_q^T, where x_q and z_q are the
columns of q over all rows.  Rows inside A or outside A drop out by themselves, so M has as many non-zero rows as cross
the boundary of A; and the next region costs only the sites in which it differs from the last.  That makes averages
over translations of two-interval regions cheap.  Source of the formula: rank of commutation matrices, as in
Entanglement in the stabilizer formalism, quant-ph/0406168 (from memory); the sum over sites is derived here.
"""

from typing import NamedTuple

import numpy as np

from sweepmill_worker.clifford.state import Lanes, State, Words, address, aligned, bit_of, column_chunk, rows_per_chunk
from sweepmill_worker.clifford.vectors import any_bit, choose, item, load, nonzero, splat, store, trailing_zeros
from sweepmill_worker.jit import part


class Matrix(NamedTuple):
    """Commutators as rows of words, chunk after chunk, and room for the rows of an elimination."""

    rows: Words
    scratch: Words


def new_matrix(state: State, lanes: Lanes, wanted: bool) -> Matrix:
    """Room for the commutators of all rows (nothing if not wanted)."""
    size = len(state.start) * state.chunks * len(lanes) if wanted else 0
    return Matrix(aligned(size, np.uint64), aligned(size, np.uint64))


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
    """Half the rank of the matrix: the entropy of the region in bits."""
    width = state.chunks * len(lanes)
    remaining = gather(state, matrix, lanes)
    rank = 0
    for row in range(remaining):
        word = 0
        while word < width and item(matrix.scratch, row * width + word) == 0:
            word += 1
        if word == width:
            continue
        rank += 1
        position = trailing_zeros(item(matrix.scratch, row * width + word))
        clear_below(state, matrix, row, remaining, word, position, lanes)
    return rank // 2


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
        found += kept
    return found


@part
def clear_below(state: State, matrix: Matrix, row: int, beyond: int, word: int, position: int, lanes: Lanes) -> None:
    """Add scratch row `row` to the later rows that have its lowest bit."""
    width = state.chunks * len(lanes)
    bit, nothing = bit_of(state, position, lanes), splat(np.uint64(0), lanes)
    for other in range(row + 1, beyond):
        here = nonzero(splat(item(matrix.scratch, other * width + word), lanes) & bit)
        for chunk in range(word // len(lanes), state.chunks):
            to = other * width + chunk * len(lanes)
            pivot = load(matrix.scratch, row * width + chunk * len(lanes), lanes)
            store(matrix.scratch, to, load(matrix.scratch, to, lanes) ^ choose(here, pivot, nothing))
