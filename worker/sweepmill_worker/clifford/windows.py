"""Windows of rows: growth with a layer of gates, union with a pivot's, and the search for the shortest row."""

import numpy as np

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
    truths,
)
from sweepmill_worker.jit import part

NOBODY = 65535
"""A tagged key above that of any row."""
LONGEST = 4094
"""Keys saturate here, so that with any tag they stay below NOBODY."""


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
def smallest(state: State, column: int, permitted: Words, starts: Shorts, ends: Shorts, lanes: Lanes) -> int:
    """Among the permitted rows with a bit in the column, one with the smallest end - start; -1 if there are none.

    Dense and free of data-dependent branches within a chunk; empty chunks are skipped where there are several.
    A key carries the number of its group, so that a minimum per lane tells the row.
    """
    best = splat_short(NOBODY)
    for chunk in range(state.chunks):
        base = 2 * address(state, chunk, column, lanes)
        first = chunk * groups_per_chunk(lanes)
        if state.chunks > 1 and not occupied(state, base, permitted, first, lanes):
            continue
        here = splat_short(NOBODY)
        for group in range(groups_per_chunk(lanes)):
            rows = truths(half(state.columns, base + group) & half(permitted, first + group))
            at = GROUP * (first + group)
            length = lower(load_shorts(ends, at) - load_shorts(starts, at), splat_short(LONGEST))
            here = choose(rows, lower_unsigned(here, tagged(length, group)), here)
        if state.chunks > 1:
            homes = load_shorts(state.homes, 0)
            store(state.homes, 0, choose(lower_unsigned(here, best) == best, homes, splat_short(chunk)))
        best = lower_unsigned(here, best)
    key = least(best)
    if key == NOBODY:
        return -1
    lane = first_true(best == splat_short(key))
    chunk = item(state.homes, lane) if state.chunks > 1 else 0
    row: int = chunk * rows_per_chunk(lanes) + GROUP * (key & 15) + lane
    return row


@part
def occupied(state: State, base: int, permitted: Words, first: int, lanes: Lanes) -> bool:
    """Has the chunk of a column any permitted row?"""
    found = np.uint32(0)
    for group in range(groups_per_chunk(lanes)):
        found |= half(state.columns, base + group) & half(permitted, first + group)
    return bool(found != 0)


@part
def unite(state: State, site: int, pivot: int, lanes: Lanes) -> None:
    """Windows of the rows that anticommute with Z of the site: union with the pivot's.  The pivot's: the site."""
    around = False
    for chunk in range(state.chunks):
        wrapping = load(state.wrapping, chunk * len(lanes), lanes)
        around |= any_bit(column_chunk(state, chunk, 2 * site, lanes) & wrapping)
    if around:
        unite_around(state, site, item(state.start, pivot), item(state.end, pivot), lanes)
    else:
        unite_straight(state, site, item(state.start, pivot), item(state.end, pivot), lanes)
    shrink(state, site, pivot, around)


@part
def unite_straight(state: State, site: int, pivot_start: int, pivot_end: int, lanes: Lanes) -> None:
    """Where no window wraps."""
    start_bound, end_bound = splat_short(pivot_start), splat_short(pivot_end)
    for chunk in range(state.chunks):
        if state.chunks > 1 and not any_bit(column_chunk(state, chunk, 2 * site, lanes)):
            continue
        base = 2 * address(state, chunk, 2 * site, lanes)
        for group in range(groups_per_chunk(lanes)):
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
