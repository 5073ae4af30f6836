"""Keep rows of neighboring sites in one chunk, so that few chunks act on a site.

A measured site takes over the slot of its pivot, which was at most a window away: slots diffuse from their sites.
Now and then rows that strayed into another chunk change places with rows that belong elsewhere.  Nothing that is read
off a state depends on the slots.
"""

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.clifford.marks import MARGIN, refresh
from sweepmill_worker.clifford.state import Lanes, State, Words, address, rows_per_chunk
from sweepmill_worker.clifford.vectors import item, put
from sweepmill_worker.jit import part, step

LONG: Final = 8
"""Windows longer than the chain by this factor make a row long.  5 and 16 were as fast within 3 %."""


class Census(NamedTuple):
    """Room for sorting."""

    every: int
    """Layers from one sorting to the next; 0: never."""
    counts: NDArray[np.int64]
    """Per place: rows there, then the rank of the next one."""
    targets: NDArray[np.int64]
    """Per slot: the chunk in which its row belongs."""
    cursors: NDArray[np.int64]
    """Per chunk: the slots before this one hold rows that belong there."""


def new_census(state: State, wanted: bool = True) -> Census:
    """Room for sorting the rows of a state, if there are several chunks and it is wanted.

    Sorting costs nothing where it gains nothing, so there is no other rule.  Gains measured at depth 2 L and
    p = 0.05 / 0.16 / 0.30: 1.0 / 1.0 / 1.1 for L = 1024, 1.4 / 1.5 / 1.7 for L = 2048.
    """
    every = MARGIN if wanted and state.chunks > 1 else 0
    sizes = state.sites + 2, len(state.start), state.chunks
    return Census(every, *(np.zeros(size, dtype=np.int64) for size in sizes))


@step
def tidy(state: State, census: Census, lanes: Lanes) -> None:
    """Sort the rows into chunks, and mark where the chunks may act."""
    choose_targets(state, census, lanes)
    for chunk in range(state.chunks):
        census.cursors[chunk] = chunk * rows_per_chunk(lanes)
    for row in range(len(state.start)):
        settle(state, census, row, lanes)
    refresh(state, lanes)


@part
def has_bit(bits: Words, row: int) -> bool:
    """Is bit `row` set?"""
    return bool((item(bits, row >> 6) >> np.uint64(row & 63)) & np.uint64(1))


@part
def place(state: State, row: int) -> int:
    """The middle of the row's window; long rows come after the last site, empty slots after these."""
    if not (has_bit(state.stabilizers, row) or has_bit(state.logicals, row)):
        return state.sites + 1
    start, end = np.int64(item(state.start, row)), np.int64(item(state.end, row))
    if LONG * (end - start) > state.sites:
        return state.sites
    middle = int((start + end) >> 1)
    return middle - state.sites if middle >= state.sites else middle


@part
def choose_targets(state: State, census: Census, lanes: Lanes) -> None:
    """Rank the rows by their places, and fill chunk after chunk."""
    census.counts[:] = 0
    for row in range(len(state.start)):
        census.counts[place(state, row)] += 1
    rank = 0
    for site in range(len(census.counts)):
        rank, census.counts[site] = rank + census.counts[site], rank
    for row in range(len(state.start)):
        site = place(state, row)
        census.targets[row] = census.counts[site] // rows_per_chunk(lanes)
        census.counts[site] += 1


@part
def settle(state: State, census: Census, row: int, lanes: Lanes) -> None:
    """Exchange the row in this slot until the slot holds one that belongs there."""
    chunk = row // rows_per_chunk(lanes)
    while item(census.targets, row) != chunk:
        target = item(census.targets, row)
        other = item(census.cursors, target)
        while item(census.targets, other) == target:
            other += 1
        put(census.cursors, target, other + 1)
        put(census.targets, row, item(census.targets, other))
        put(census.targets, other, target)
        exchange(state, row, other, lanes)


@part
def exchange(state: State, row: int, other: int, lanes: Lanes) -> None:
    """Two rows change slots."""
    start, length = np.int64(item(state.start, row)), np.int64(item(state.end, row) - item(state.start, row))
    for position in range(start, start + length + 1):
        exchange_at(state, position % state.sites, row, other, lanes)
    for position in range(np.int64(item(state.start, other)), np.int64(item(state.end, other)) + 1):
        if (position - start) % state.sites > length:
            exchange_at(state, position % state.sites, row, other, lanes)
    for bits in (state.stabilizers, state.logicals, state.wrapping):
        exchange_bits(bits, row >> 6, row & 63, other >> 6, other & 63)
    state.start[row], state.start[other] = state.start[other], state.start[row]
    state.end[row], state.end[other] = state.end[other], state.end[row]
    exchange_partners(state, row, other)


@part
def exchange_at(state: State, site: int, row: int, other: int, lanes: Lanes) -> None:
    """Exchange the bits of two rows in the columns of a site."""
    for column in (2 * site, 2 * site + 1):
        word, other_word = bit_word(state, column, row, lanes), bit_word(state, column, other, lanes)
        exchange_bits(state.columns, word, row & 63, other_word, other & 63)


@part
def bit_word(state: State, column: int, row: int, lanes: Lanes) -> int:
    """Index of the word of a column that holds the bit of a row."""
    chunk = row // rows_per_chunk(lanes)
    return address(state, chunk, column, lanes) + (row - chunk * rows_per_chunk(lanes) >> 6)


@part
def exchange_bits(words: Words, word: int, bit: int, other_word: int, other_bit: int) -> None:
    """Exchange two bits of an array."""
    flip = (item(words, word) >> np.uint64(bit)) ^ (item(words, other_word) >> np.uint64(other_bit))
    flip &= np.uint64(1)
    put(words, word, item(words, word) ^ (flip << np.uint64(bit)))
    put(words, other_word, item(words, other_word) ^ (flip << np.uint64(other_bit)))


@part
def exchange_partners(state: State, row: int, other: int) -> None:
    """Logical rows keep their partners, wherever these are; entries of other rows mean nothing."""
    if state.partner[row] == other and state.partner[other] == row:
        return
    state.partner[row], state.partner[other] = state.partner[other], state.partner[row]
    for moved in (row, other):
        if has_bit(state.logicals, moved):
            state.partner[state.partner[moved]] = moved
