"""Eliminations along the line, the chain cut open at site 0: all prefixes at once, and the clipped gauge.

They work on a copy of the columns of the first sites, where a row ends no later than `ends`.
"""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.clifford.moves import add_pivot
from sweepmill_worker.clifford.state import (
    Lanes,
    Shorts,
    State,
    Words,
    address,
    aligned,
    erase,
    insert,
)
from sweepmill_worker.clifford.vectors import any_bit, load, store
from sweepmill_worker.clifford.windows import smallest
from sweepmill_worker.jit import part, step


class Desk(NamedTuple):
    """Work space of the readings."""

    copy: State
    """The columns; `stabilizers` marks the rows that are not yet pivots, `start` stays zero."""
    ends: Shorts
    """Per row, the last position (in the direction of the sweep) where it may have support."""
    left: Shorts
    """Clipped gauge: first position of the support of each row that has some; -1 for every other slot."""
    right: Shorts
    """Clipped gauge: last position of the support."""
    ranks: NDArray[np.int32]
    """Rank of the columns of the first x positions, x = 0 .. total sites."""
    rows: Words
    """Some rows, as bits."""
    heads: NDArray[np.int32]
    """Per position one of the clipped rows that begin there, or -1."""
    following: NDArray[np.int32]
    """Per row another one that begins there, too, or -1."""
    counts: NDArray[np.int32]
    """Room for a count per position or length, and a few more."""
    basis: Words
    """Room for 64 words: independent columns of up to 64 rows."""


def new_desk(copy: State) -> Desk:
    """Work space beside a spare state."""
    slots, sites = len(copy.start), copy.sites
    ends, left, right = (aligned(slots, np.int16) for _ in range(3))
    ranks, heads, following, counts = (np.zeros(n, dtype=np.int32) for n in (sites + 1, sites, slots, sites + 4))
    rows = aligned(len(copy.stabilizers), np.uint64)
    return Desk(copy, ends, left, right, ranks, rows, heads, following, counts, aligned(64, np.uint64))


@step
def cut_open(state: State, desk: Desk, sites: int, lanes: Lanes) -> None:
    """Copy the columns of the first `sites` sites, and bound the rows' ends."""
    copy, width = desk.copy, len(lanes)
    for chunk in range(state.chunks):
        source, to = address(state, chunk, 0, lanes), address(copy, chunk, 0, lanes)
        for column in range(2 * sites):
            store(copy.columns, to + column * width, load(state.columns, source + column * width, lanes))
    for row in range(len(state.start)):
        desk.ends[row] = min(state.end[row], sites - 1)


@step
def sweep(desk: Desk, sites: int, backward: bool, met: Shorts, lanes: Lanes) -> None:
    """Eliminate position by position: afterwards pivots that begin at one position are independent there.

    The pivot is the row that ends first, so no other row ends later for being multiplied by it.  met[row] = position
    at which the row became pivot, counted from the left whatever the direction; desk.ranks counts in sweep order.
    """
    copy, last, rank = desk.copy, sites - 1, 0
    desk.ranks[0] = 0
    for position in range(sites):
        site = last - position if backward else position
        for column in (2 * site, 2 * site + 1):
            pivot = smallest(copy, column, copy.stabilizers, copy.start, desk.ends, lanes)
            if pivot < 0:
                continue
            erase(copy.stabilizers, pivot)
            met[pivot] = site
            rank += 1
            end = last - desk.ends[pivot] if backward else desk.ends[pivot]
            clear_column(copy, column, min(site, end), max(site, end), pivot, lanes)
        desk.ranks[position + 1] = rank


@step
def leave_inside(desk: Desk, depths: NDArray[np.int64], lanes: Lanes) -> None:
    """Eliminate the positions of depth 0: the rows still marked generate the group inside the other positions."""
    copy = desk.copy
    for site in range(copy.sites):
        if depths[site] != 0:
            continue
        for column in (2 * site, 2 * site + 1):
            pivot = smallest(copy, column, copy.stabilizers, copy.start, desk.ends, lanes)
            if pivot >= 0:
                erase(copy.stabilizers, pivot)
                clear_column(copy, column, 0, desk.ends[pivot], pivot, lanes)


@part
def clear_column(copy: State, column: int, first: int, last: int, pivot: int, lanes: Lanes) -> None:
    """Multiply the pivot, supported on first .. last, into the remaining rows with a bit in the column."""
    for chunk in range(copy.chunks):
        remaining = load(copy.stabilizers, chunk * len(lanes), lanes)
        rows = load(copy.columns, address(copy, chunk, column, lanes), lanes) & remaining
        if any_bit(rows):
            add_pivot(copy, chunk, rows, 2 * first, 2 * last + 2, pivot, lanes)


@part
def copy_rows(to: Words, first: Words, second: Words) -> None:
    """to = first | second."""
    for word in range(len(to)):
        to[word] = first[word] | second[word]


@step
def clip(state: State, desk: Desk, sites: int, others: Words, lanes: Lanes) -> None:
    """Bring the stabilizers and the `others` among the rows to the clipped gauge on the first sites.

    Leaves the exact ends of their supports there in desk.left and desk.right.  A product of rows then begins where its
    first factor begins and ends where its last one ends, so all products inside an interval are generated by the rows
    inside it.  The backward sweep keeps the left ends: its pivot is the row that begins last.
    """
    cut_open(state, desk, sites, lanes)
    copy_rows(desk.copy.stabilizers, state.stabilizers, others)
    desk.left[:] = -1
    sweep(desk, sites, False, desk.left, lanes)
    mark(desk, desk.copy.stabilizers, sites)
    for row in range(len(desk.left)):
        desk.ends[row] = sites - 1 - desk.left[row]
    sweep(desk, sites, True, desk.right, lanes)


@part
def mark(desk: Desk, rows: Words, beyond: int) -> None:
    """rows = the clipped rows that begin before a position."""
    for word in range(len(rows)):
        rows[word] = 0
    for row in range(len(desk.left)):
        if 0 <= desk.left[row] < beyond:
            insert(rows, row)
