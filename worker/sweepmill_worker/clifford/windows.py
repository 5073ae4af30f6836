"""Windows of rows: growth with a layer of gates, union with a pivot's, and the search for the shortest row."""

from typing import Final

import numpy as np

from sweepmill_worker.clifford.marks import chunks_at
from sweepmill_worker.clifford.state import (
    Lanes,
    Shorts,
    State,
    Words,
    address,
    column_chunk,
    groups_per_chunk,
    rows_per_chunk,
)
from sweepmill_worker.clifford.vectors import (
    GROUP,
    Value,
    any_bit,
    bits,
    choose,
    filled_halves,
    first_true,
    half,
    higher,
    item,
    least,
    load,
    load_shorts,
    lower,
    lower_unsigned,
    put_half,
    splat_short,
    store,
    tagged,
    trailing_zeros,
    truths,
    without_lowest,
)
from sweepmill_worker.jit import part, step

NOBODY: Final = 65535
"""A key above that of any row."""
LONGEST: Final = 4094
"""Keys have 12 bits for a length; rows at least as long as this are told apart one by one."""


@part
def grow(state: State, parity: int, periodic: bool) -> None:
    """Extend every window to the boundaries of the bricks (parity, parity + 1), (parity + 2, parity + 3), ..."""
    one, offset, furthest = splat_short(1), splat_short(parity), splat_short(state.sites - 1)
    lowest = splat_short(-1 if periodic else 0)
    highest = splat_short(32767 if periodic else state.sites - 1)
    for group in range(len(state.start) // GROUP):
        start, end = load_shorts(state.start, GROUP * group), load_shorts(state.end, GROUP * group)
        start = higher(start - ((start ^ offset) & one), lowest)
        end = lower(end + (((end ^ offset) & one) ^ one), highest)
        keep(state, group, start, lower(end, start + furthest))


@part
def keep(state: State, group: int, start: Value, end: Value) -> None:
    """Store the windows of a group, with starts from -L on brought into 0 .. L - 1, and mark those that wrap."""
    zero = splat_short(0)
    turn = choose(start < zero, splat_short(state.sites), zero)
    start, end = start + turn, end + turn
    store(state.start, GROUP * group, start)
    store(state.end, GROUP * group, end)
    put_half(state.wrapping, group, bits(splat_short(state.sites - 1) < end))


@part
def groups_to_visit(rows: Value, lanes: Lanes) -> np.uint64:
    """Bits of the groups of a chunk that have any of the rows; of up to 4 groups all or none.

    So short a loop costs less than a surprise about its end: 2 to 6 % of the time for up to 128 rows.
    """
    groups: np.uint64 = filled_halves(rows)
    if len(lanes) <= 2 and groups != 0:
        return (np.uint64(1) << np.uint64(groups_per_chunk(lanes))) - np.uint64(1)
    return groups


@part
def smallest(state: State, column: int, permitted: Words, starts: Shorts, ends: Shorts, lanes: Lanes) -> int:
    """Among the permitted rows with a bit in the column, one with the smallest end - start; -1 if there are none."""
    best, smallest_length = -1, NOBODY
    chunks = chunks_at(state, column >> 1)
    while chunks != 0:
        chunk = trailing_zeros(chunks)
        chunks = without_lowest(chunks)
        rows = column_chunk(state, chunk, column, lanes) & load(permitted, chunk * len(lanes), lanes)
        groups = groups_to_visit(rows, lanes)
        if groups != 0:
            length, row = smallest_in_groups(state, chunk, column, groups, permitted, starts, ends, lanes)
            if length < smallest_length:
                best, smallest_length = row, length
    return best


@part
def smallest_in_groups(
    state: State,
    chunk: int,
    column: int,
    groups: np.uint64,
    permitted: Words,
    starts: Shorts,
    ends: Shorts,
    lanes: Lanes,
) -> tuple[int, int]:
    """Its length and number, in one chunk of which these groups of 32 rows have any.

    Skipping the other groups is most of the speed at high rates.  A key carries the number of its group, so that a
    minimum per lane tells the row.
    """
    base, first = 2 * address(state, chunk, column, lanes), chunk * groups_per_chunk(lanes)
    best, remaining = splat_short(NOBODY), groups
    while remaining != 0:
        group = trailing_zeros(remaining)
        remaining = without_lowest(remaining)
        rows = truths(half(state.columns, base + group) & half(permitted, first + group))
        at = GROUP * (first + group)
        length = lower(load_shorts(ends, at) - load_shorts(starts, at), splat_short(LONGEST))
        best = choose(rows, lower_unsigned(best, tagged(length, group)), best)
    key = least(best)
    if key >> 4 == LONGEST:
        return smallest_one_by_one(state, chunk, column, permitted, starts, ends, lanes)
    return key >> 4, GROUP * (first + (key & 15)) + first_true(best == splat_short(key))


@step
def smallest_one_by_one(
    state: State, chunk: int, column: int, permitted: Words, starts: Shorts, ends: Shorts, lanes: Lanes
) -> tuple[int, int]:
    """The same, where all rows are too long for the keys."""
    best, smallest_length = -1, NOBODY
    for word in range(len(lanes)):
        rows = item(state.columns, address(state, chunk, column, lanes) + word)
        rows &= item(permitted, chunk * len(lanes) + word)
        while rows != 0:
            row = chunk * rows_per_chunk(lanes) + 64 * word + trailing_zeros(rows)
            rows = without_lowest(rows)
            length = int(np.int64(item(ends, row)) - np.int64(item(starts, row)))
            if length < smallest_length:
                best, smallest_length = row, length
    return smallest_length, best


@part
def unite(state: State, site: int, pivot: int, lanes: Lanes) -> None:
    """Windows of the rows that anticommute with Z of the site: union with the pivot's.  The pivot's: the site."""
    around = any_wraps(state, site, lanes)
    if around:
        unite_around(state, site, item(state.start, pivot), item(state.end, pivot), lanes)
    else:
        unite_straight(state, site, item(state.start, pivot), item(state.end, pivot), lanes)
    shrink(state, site, pivot, around)


@part
def any_wraps(state: State, site: int, lanes: Lanes) -> bool:
    """Does the window of any anticommuting row wrap around the ring?"""
    around, chunks = False, chunks_at(state, site)
    while chunks != 0:
        chunk = trailing_zeros(chunks)
        chunks = without_lowest(chunks)
        wrapping = load(state.wrapping, chunk * len(lanes), lanes)
        around |= any_bit(column_chunk(state, chunk, 2 * site, lanes) & wrapping)
    return around


@part
def unite_straight(state: State, site: int, pivot_start: int, pivot_end: int, lanes: Lanes) -> None:
    """Where no window wraps."""
    start_bound, end_bound = splat_short(pivot_start), splat_short(pivot_end)
    chunks = chunks_at(state, site)
    while chunks != 0:
        chunk = trailing_zeros(chunks)
        chunks = without_lowest(chunks)
        base = 2 * address(state, chunk, 2 * site, lanes)
        groups = groups_to_visit(column_chunk(state, chunk, 2 * site, lanes), lanes)
        while groups != 0:
            group = trailing_zeros(groups)
            groups = without_lowest(groups)
            rows = truths(half(state.columns, base + group))
            at = GROUP * (chunk * groups_per_chunk(lanes) + group)
            start, end = load_shorts(state.start, at), load_shorts(state.end, at)
            store(state.start, at, choose(rows, lower(start, start_bound), start))
            store(state.end, at, choose(rows, higher(end, end_bound), end))


@part
def unite_around(state: State, site: int, pivot_start: int, pivot_end: int, lanes: Lanes) -> None:
    """Where some windows wrap: first turn all so that start <= site <= end."""
    zero, ring, here = splat_short(0), splat_short(state.sites), splat_short(site)
    turn = state.sites if pivot_start > site else 0
    start_bound, end_bound = splat_short(pivot_start - turn), splat_short(pivot_end - turn)
    for group in range(len(state.start) // GROUP):
        chunk, within = group // groups_per_chunk(lanes), group % groups_per_chunk(lanes)
        rows = truths(half(state.columns, 2 * address(state, chunk, 2 * site, lanes) + within))
        start, end = load_shorts(state.start, GROUP * group), load_shorts(state.end, GROUP * group)
        turned = choose(here < start, ring, zero)
        new_start = lower(start - turned, start_bound)
        new_end = lower(higher(end - turned, end_bound), new_start + splat_short(state.sites - 1))
        keep(state, group, choose(rows, new_start, start), choose(rows, new_end, end))


@part
def shrink(state: State, site: int, pivot: int, around: bool) -> None:
    """The pivot's window: the site.  Whole vectors, so that later loads find them in the store buffer."""
    group = pivot >> 5
    row, here = truths(np.uint32(1) << np.uint32(pivot & 31)), splat_short(site)
    start = choose(row, here, load_shorts(state.start, GROUP * group))
    end = choose(row, here, load_shorts(state.end, GROUP * group))
    store(state.start, GROUP * group, start)
    store(state.end, GROUP * group, end)
    if around:
        put_half(state.wrapping, group, bits(splat_short(state.sites - 1) < end))
