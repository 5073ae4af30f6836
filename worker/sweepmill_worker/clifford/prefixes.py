"""Ranks of the columns of all prefixes of the chain: S(x) = rank of the first x sites - x, pure or mixed."""

from typing import Final

import numpy as np

from sweepmill_worker.clifford.elimination import Desk, copy_rows, cut_open, sweep
from sweepmill_worker.clifford.state import Lanes, State
from sweepmill_worker.clifford.vectors import choose, item, load, nonzero, put, splat, store, trailing_zeros
from sweepmill_worker.jit import part, step

EIGHT: Final = (0,) * 8
"""Words in a vector of the basis."""


@step
def rank_prefixes(state: State, desk: Desk, sites: int, lanes: Lanes) -> None:
    """Leave in desk.ranks the ranks of all prefixes 0 .. x - 1 of the first sites."""
    if len(lanes) == 1:
        rank_words(state, desk, sites)
        return
    cut_open(state, desk, sites, lanes)
    copy_rows(desk.copy.stabilizers, state.stabilizers, state.logicals)
    sweep(desk, sites, False, desk.left, lanes)


@part
def rank_words(state: State, desk: Desk, sites: int) -> None:
    """With up to 64 rows a column is a word: keep a basis of those so far, each with a bit that no other one has."""
    used = item(state.stabilizers, 0) | item(state.logicals, 0)
    taken, rank = np.uint64(0), 0
    desk.basis[:] = 0
    desk.ranks[0] = 0
    for column in range(2 * sites):
        word = item(state.columns, column) & used
        known = word & taken
        while known != 0:
            word ^= item(desk.basis, trailing_zeros(known))
            known &= known - np.uint64(1)
        if word != 0:
            bit = word & (~word + np.uint64(1))
            join_basis(desk, word, bit)
            taken |= bit
            rank += 1
        desk.ranks[(column >> 1) + 1] = rank


@part
def join_basis(desk: Desk, word: np.uint64, bit: np.uint64) -> None:
    """Clear the bit from the other words of the basis."""
    added, here = splat(word, EIGHT), splat(bit, EIGHT)
    for at in range(0, 64, len(EIGHT)):
        words = load(desk.basis, at, EIGHT)
        store(desk.basis, at, choose(nonzero(words & here), words ^ added, words))
    put(desk.basis, trailing_zeros(bit), word)
