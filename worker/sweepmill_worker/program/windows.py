"""Windows where operations join sites anywhere: hulls, on a ring the shorter way round."""

import numpy as np

from sweepmill_worker.clifford.state import Lanes, State, address, column_chunk, groups_per_chunk
from sweepmill_worker.clifford.vectors import (
    GROUP,
    Value,
    any_bit,
    bits,
    choose,
    half,
    higher,
    load_shorts,
    lower,
    put_half,
    splat_short,
    store,
    truths,
)
from sweepmill_worker.clifford.windows import keep
from sweepmill_worker.jit import part


@part
def shortest(start: Value, end: Value, first: int, last: int, sites: int) -> tuple[Value, Value]:
    """Hulls of windows and the arc first .. last: the shortest over the turns of the arc."""
    best_start, best_end = lower(start, splat_short(first)), higher(end, splat_short(last))
    for turn in (-sites, sites):
        new_start, new_end = lower(start, splat_short(first + turn)), higher(end, splat_short(last + turn))
        shorter = new_end - new_start < best_end - best_start
        best_start, best_end = choose(shorter, new_start, best_start), choose(shorter, new_end, best_end)
    return best_start, lower(best_end, best_start + splat_short(sites - 1))


@part
def extend(state: State, group: int, rows: Value, first: int, last: int, ring: bool) -> None:
    """Windows of some rows of a group: hull with the arc first .. last."""
    start, end = load_shorts(state.start, GROUP * group), load_shorts(state.end, GROUP * group)
    if ring:
        new_start, new_end = shortest(start, end, first, last, state.sites)
        keep(state, group, choose(rows, new_start, start), choose(rows, new_end, end))
    else:
        store(state.start, GROUP * group, choose(rows, lower(start, splat_short(first)), start))
        store(state.end, GROUP * group, choose(rows, higher(end, splat_short(last)), end))


@part
def extend_rows(state: State, column: int, first: int, last: int, ring: bool, lanes: Lanes) -> None:
    """Windows of the rows of a column: hull with the arc first .. last."""
    for chunk in range(state.chunks):
        if state.chunks > 1 and not any_bit(column_chunk(state, chunk, column, lanes)):
            continue
        base = 2 * address(state, chunk, column, lanes)
        for group in range(groups_per_chunk(lanes)):
            rows = truths(half(state.columns, base + group))
            extend(state, chunk * groups_per_chunk(lanes) + group, rows, first, last, ring)


@part
def extend_over(state: State, one: int, other: int, ring: bool, lanes: Lanes) -> None:
    """Windows of the rows on either site: hull with the arc between the two."""
    first, last = arc(min(one, other), max(one, other), state.sites, ring)
    width = 2 * len(lanes)
    for chunk in range(state.chunks):
        to_one, to_other = 2 * address(state, chunk, 2 * one, lanes), 2 * address(state, chunk, 2 * other, lanes)
        for group in range(groups_per_chunk(lanes)):
            at_one = half(state.columns, to_one + group) | half(state.columns, to_one + width + group)
            at_other = half(state.columns, to_other + group) | half(state.columns, to_other + width + group)
            extend(state, chunk * groups_per_chunk(lanes) + group, truths(at_one | at_other), first, last, ring)


@part
def arc(low: int, high: int, sites: int, ring: bool) -> tuple[int, int]:
    """The shorter arc between two sites, low <= high."""
    if ring and 2 * (high - low) > sites:
        return high, low + sites
    return low, high


@part
def set_window(state: State, row: int, first: int, last: int) -> None:
    """Whole vectors, so that later loads find them in the store buffer."""
    group = row >> 5
    here = truths(np.uint32(1) << np.uint32(row & 31))
    start = choose(here, splat_short(first), load_shorts(state.start, GROUP * group))
    end = choose(here, splat_short(last), load_shorts(state.end, GROUP * group))
    store(state.start, GROUP * group, start)
    store(state.end, GROUP * group, end)
    put_half(state.wrapping, group, bits(splat_short(state.sites - 1) < end))
