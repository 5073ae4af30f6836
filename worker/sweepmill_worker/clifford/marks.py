"""Where a chunk may act: one bit per block of sites, so that empty chunks are skipped without a look at them.

Windows grow by at most one site on either side per layer of gates.  Marks made with a margin therefore hold for as
many layers as the margin has sites, if measurements add the pivot's window, with the same margin, to every chunk
that they change.  A state whose marks are all set is always right, only slower.
"""

from typing import Final

import numpy as np

from sweepmill_worker.clifford.state import ALL_BLOCKS, Lanes, State, groups_per_chunk
from sweepmill_worker.clifford.vectors import (
    bits_of_eight,
    item,
    load,
    nonzero,
    put,
    splat,
    trailing_zeros,
    without_lowest,
)
from sweepmill_worker.jit import part

EIGHT: Final = (0,) * 8
"""Chunks that are looked at in one vector."""
MARGIN: Final = 32
"""Sites; the most layers between two refreshes.  16 and 64 were as fast within 3 %."""


@part
def chunks_at(state: State, site: int) -> np.uint64:
    """Bits of the chunks that may act on the site."""
    if state.chunks == 1:
        return np.uint64(1)
    block = splat(np.uint64(1) << np.uint64((site >> state.block) & 63), EIGHT)
    found = np.uint64(0)
    for chunk in range(0, state.chunks, 8):
        found |= bits_of_eight(nonzero(load(state.marks, chunk, EIGHT) & block)) << np.uint64(chunk)
    return found


@part
def first_blocks(count: int) -> np.uint64:
    """Bits of the blocks 0 .. count - 1, for 1 <= count <= 64."""
    return ALL_BLOCKS >> np.uint64(64 - count)


@part
def blocks_around(state: State, start: int, end: int) -> np.uint64:
    """Blocks of the sites from start - MARGIN to end + MARGIN around the ring, for 0 <= start <= end < start + L."""
    first, beyond = start - MARGIN, end + MARGIN + 1
    if beyond - first >= state.sites:
        return ALL_BLOCKS
    if first < 0:
        first, beyond = first + state.sites, beyond + state.sites
    from_first = ALL_BLOCKS << np.uint64(first >> state.block)
    if beyond <= state.sites:
        return from_first & first_blocks(((beyond - 1) >> state.block) + 1)
    return from_first | first_blocks(((beyond - state.sites - 1) >> state.block) + 1)


@part
def mark(state: State, chunk: int, start: int, end: int) -> None:
    """Rows of the chunk may act on start .. end from now on."""
    put(state.marks, chunk, item(state.marks, chunk) | blocks_around(state, start, end))


@part
def run_length(blocks: np.uint64) -> int:
    """How many of the lowest bits are set without a gap?"""
    gaps = ~blocks
    return trailing_zeros(gaps) if gaps != 0 else 64


@part
def refresh(state: State, lanes: Lanes) -> None:
    """Mark what the windows of each chunk can reach within MARGIN layers."""
    words = groups_per_chunk(lanes) // 2
    for chunk in range(state.chunks):
        marks = np.uint64(0)
        for word in range(chunk * words, chunk * words + words):
            rows = item(state.stabilizers, word) | item(state.logicals, word)
            while rows != 0:
                row = 64 * word + trailing_zeros(rows)
                rows = without_lowest(rows)
                marks |= blocks_around(state, item(state.start, row), item(state.end, row))
        state.marks[chunk] = marks
