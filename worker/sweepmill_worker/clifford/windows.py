"""Windows of rows: growth with a layer of gates, union with a pivot's, and the search for the shortest row."""

import numpy as np

from sweepmill_worker.clifford.state import Halves, Lanes, Shorts, State, address, groups_per_chunk
from sweepmill_worker.clifford.vectors import (
    GROUP,
    choose,
    element,
    first_true,
    higher,
    least,
    load_shorts,
    lower,
    splat_short,
    store,
    truths,
)
from sweepmill_worker.jit import part, step

NEVER = 32767
"""A key larger than that of any row."""


@part
def wrapped(site, ring: int):  # type: ignore[no-untyped-def]
    """Sites of -ring .. ring - 1, brought into 0 .. ring - 1."""
    zero = splat_short(0)
    return site + choose(site < zero, splat_short(ring), zero)


@step
def grow(state: State, parity: int, periodic: bool) -> None:
    """Extend every window to the boundaries of the bricks (parity, parity + 1), (parity + 2, parity + 3), ..."""
    one, offset, furthest = splat_short(1), splat_short(parity), splat_short(state.sites - 1)
    lowest = splat_short(-1 if periodic else 0)
    highest = splat_short(NEVER if periodic else state.sites - 1)
    for at in range(0, len(state.start), GROUP):
        start = load_shorts(state.start, at)
        end = start + load_shorts(state.reach, at)
        start = higher(start - ((start ^ offset) & one), lowest)
        end = lower(end + (((end ^ offset) & one) ^ one), highest)
        store(state.reach, at, lower(end - start, furthest))
        store(state.start, at, wrapped(start, state.sites))


@part
def smallest(state: State, column: int, permitted: Halves, keys: Shorts, lanes: Lanes) -> int:
    """Among the permitted rows with a bit in the column, one with the smallest key; -1 if there are none.

    Dense and free of data-dependent branches within a chunk; empty chunks are skipped where there are several.
    """
    best, home = splat_short(NEVER), splat_short(0)
    for chunk in range(state.chunks):
        base = 2 * address(state, chunk, column, lanes)
        first = chunk * groups_per_chunk(lanes)
        if state.chunks > 1 and not occupied(state.column_groups, base, permitted, first, lanes):
            continue
        for group in range(groups_per_chunk(lanes)):
            rows = truths(state.column_groups[base + group] & permitted[first + group])
            key = load_shorts(keys, GROUP * (first + group))
            better = (key < best) & rows
            best = choose(better, key, best)
            home = choose(better, splat_short(first + group), home)
    key = least(best)
    if key == NEVER:
        return -1
    lane = first_true(best == splat_short(key))
    return GROUP * element(home, lane) + lane


@part
def occupied(groups: Halves, base: int, permitted: Halves, first: int, lanes: Lanes) -> bool:
    """Has the chunk of a column any permitted row?"""
    found = np.uint32(0)
    for group in range(groups_per_chunk(lanes)):
        found |= groups[base + group] & permitted[first + group]
    return found != 0


@part
def unite(state: State, site: int, pivot: int, lanes: Lanes) -> None:
    """Windows of the rows that anticommute with Z of the site: union with the pivot's.  The pivot's: the site.

    All these windows contain the site, so a union is the larger extent to its left and the larger to its right.
    """
    pivot_left = site - state.start[pivot]
    pivot_left += state.sites if pivot_left < 0 else 0
    least_left, least_right = splat_short(pivot_left), splat_short(state.reach[pivot] - pivot_left)
    here, furthest = splat_short(site), splat_short(state.sites - 1)
    for chunk in range(state.chunks):
        base = 2 * address(state, chunk, 2 * site, lanes)
        first = chunk * groups_per_chunk(lanes)
        if state.chunks > 1 and not occupied(state.column_groups, base, state.column_groups, base, lanes):
            continue
        for group in range(groups_per_chunk(lanes)):
            rows = truths(state.column_groups[base + group])
            replaced = truths(
                np.uint32(1) << np.uint32(pivot & 31) if first + group == pivot >> 5 else np.uint32(0)
            )
            at = GROUP * (first + group)
            start, reach = load_shorts(state.start, at), load_shorts(state.reach, at)
            left = wrapped(here - start, state.sites)
            right = higher(reach - left, least_right)
            left = higher(left, least_left)
            new_start = choose(rows, wrapped(here - left, state.sites), start)
            new_reach = choose(rows, lower(left + right, furthest), reach)
            store(state.start, at, choose(replaced, here, new_start))
            store(state.reach, at, choose(replaced, splat_short(0), new_reach))
