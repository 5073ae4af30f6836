"""The state of one trajectory: generators of a sign-free stabilizer group, stored by columns.

Entropies and the number of random outcomes do not depend on signs, so only the symplectic part is kept.  Row r of the
group is bit r of every column; site q has column 2q (X part) and 2q + 1 (Z part).  Rows come in groups of 32 (one
vector of shorts for their windows), groups in chunks of 64 * len(lanes) rows (one vector of words per column).

Invariants between layers:

I1  The rows in use are independent; the stabilizers commute and generate the group modulo signs.
I2  A row is the identity outside its window, the sites start .. end modulo L, with 0 <= start < L and
    start <= end < start + L.  Rows whose window wraps (end >= L) are marked.  Windows are bounds, not always tight.
I3  The rows of a chunk are the identity outside the blocks of sites that are marked for it.

A mixed state of rank r also keeps 2 (L - r) logical rows, in pairs that anticommute within the pair and commute with
everything else.  They are the sites' part of a purification by L - r reference qubits, and they turn two questions
into bit tests: a Pauli that commutes with all rows lies in the group; and every entropy is that of a pure state,
S(A) = rank of the columns of A over all rows - |A|.
"""

from typing import NamedTuple, TypeVar

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.clifford.vectors import GROUP, Value, load, one_hot, store
from sweepmill_worker.jit import part

ALL_BLOCKS = np.uint64(0xFFFFFFFFFFFFFFFF)
STEP = 4
"""Columns that `moves.add_pivot` takes at a time."""

T = TypeVar("T", bound=np.generic)
Words = NDArray[np.uint64]
Halves = NDArray[np.uint32]
Shorts = NDArray[np.int16]
Lanes = tuple[int, ...]


class State(NamedTuple):
    """Arrays of one trajectory."""

    sites: int
    chunks: int
    stride: int
    """Columns from one chunk to the next."""
    columns: Words
    stabilizers: Words
    """Bit r: row r is a stabilizer."""
    logicals: Words
    """Bit r: row r is a logical row."""
    partner: NDArray[np.int32]
    start: Shorts
    end: Shorts
    wrapping: Words
    """Bit r: the window of row r wraps around the ring."""
    block: int
    """Sites come in blocks of 2 ** block, at most 64 of them."""
    marks: Words
    """Bit b of word c: rows of chunk c may act on sites of block b.  See `marks`."""
    bit_vectors: Words
    """64 vectors: bit b in every lane.  In memory, lest the compiler turn vector tests into scalar ones."""


def aligned(shape: int, dtype: type[T]) -> NDArray[T]:
    """Zeros whose first element starts a cache line."""
    size = shape * np.dtype(dtype).itemsize
    raw = np.zeros(size + 64, dtype=np.uint8)
    begin = -raw.ctypes.data % 64
    return raw[begin : begin + size].view(dtype)


def lanes_for(rows: int) -> int:
    """Words per vector: 1, 2, 4, or 8 with as many chunks as needed."""
    return next((lanes for lanes in (1, 2, 4) if rows <= 64 * lanes), 8)


def new_state(sites: int, mixed: bool) -> tuple[State, Lanes]:
    """Room for a state; its content is made by `reset`."""
    rows = 2 * sites if mixed else sites
    lanes = lanes_for(rows)
    chunks = -(-rows // (64 * lanes))
    stride = 2 * sites + STEP - 1  # spare columns stay empty; an odd number: chunks of a site in different cache sets
    slots = 64 * lanes * chunks
    columns = aligned(chunks * stride * lanes, np.uint64)
    stabilizers, logicals, wrapping = (aligned(chunks * lanes, np.uint64) for _ in range(3))
    marks = aligned(-(-chunks // 8) * 8, np.uint64)
    marks[:chunks] = ALL_BLOCKS
    bit_vectors = aligned(64 * lanes, np.uint64)
    bit_vectors[:] = np.repeat(np.uint64(1) << np.arange(64, dtype=np.uint64), lanes)
    state = State(
        sites=sites,
        chunks=chunks,
        stride=stride,
        columns=columns,
        stabilizers=stabilizers,
        logicals=logicals,
        partner=np.zeros(slots, dtype=np.int32),
        start=aligned(slots, np.int16),
        end=aligned(slots, np.int16),
        wrapping=wrapping,
        block=max(1, (sites - 1).bit_length() - 6),
        marks=marks,
        bit_vectors=bit_vectors,
    )
    return state, (0,) * lanes


@part
def reset(state: State, mixed: bool, lanes: Lanes) -> None:
    """All sites in |0> (row q is Z of site q), or maximally mixed (row c is logical, its only bit in column c)."""
    state.start[:] = 0
    state.end[:] = 0
    state.wrapping[:] = 0
    state.marks[: state.chunks] = ALL_BLOCKS
    mark_first(state.stabilizers, 0 if mixed else state.sites)
    mark_first(state.logicals, 2 * state.sites if mixed else 0)
    for column in range(2 * state.sites):
        row = column if mixed else (column >> 1 if column & 1 else -1)
        write_one_hot(state, column, row, lanes)
        if row >= 0:
            state.start[row] = column >> 1
            state.end[row] = column >> 1
            state.partner[row] = row ^ 1


@part
def mark_first(bits: Words, count: int) -> None:
    """Set bits 0 .. count - 1, clear the others."""
    for word in range(len(bits)):
        inside = min(max(count - 64 * word, 0), 64)
        bits[word] = np.uint64(0xFFFFFFFFFFFFFFFF) >> np.uint64(64 - inside) if inside else np.uint64(0)


@part
def address(state: State, chunk: int, column: int, lanes: Lanes) -> int:
    """Index of the first word of a chunk of a column."""
    return (chunk * state.stride + column) * len(lanes)


@part
def write_one_hot(state: State, column: int, row: int, lanes: Lanes) -> None:
    """Column = the single bit `row` (nothing if row < 0)."""
    for chunk in range(state.chunks):
        write_chunk(state, chunk, column, row, lanes)


@part
def write_chunk(state: State, chunk: int, column: int, row: int, lanes: Lanes) -> None:
    """One chunk of a column = the single bit `row`, as a whole vector; nothing if the row lies outside."""
    bit = one_hot(row - rows_per_chunk(lanes) * chunk, lanes)
    store(state.columns, address(state, chunk, column, lanes), bit)


@part
def erase(bits: Words, row: int) -> None:
    """Clear bit `row`."""
    bits[row >> 6] &= ~(np.uint64(1) << np.uint64(row & 63))


@part
def insert(bits: Words, row: int) -> None:
    """Set bit `row`."""
    bits[row >> 6] |= np.uint64(1) << np.uint64(row & 63)


@part
def groups_per_chunk(lanes: Lanes) -> int:
    """Groups of 32 rows in one chunk."""
    return 2 * len(lanes)


@part
def rows_per_chunk(lanes: Lanes) -> int:
    """Rows in one chunk."""
    return GROUP * groups_per_chunk(lanes)


@part
def column_chunk(state: State, chunk: int, column: int, lanes: Lanes) -> Value:
    """The vector of a chunk of a column."""
    return load(state.columns, address(state, chunk, column, lanes), lanes)


@part
def bit_of(state: State, row: int, lanes: Lanes) -> Value:
    """Bit row % 64 in every lane."""
    return load(state.bit_vectors, (row & 63) * len(lanes), lanes)
