"""Places that are drawn: disjoint random pairs, and places one after another.

All words of a step come from one stream.  Pairs: repeatedly an unpaired site, uniformly, and its partner among the
unpaired sites with probability proportional to r ** -exponent, by proposing offsets from a cumulated table until one
hits an unpaired site; after 32 misses by summing the weights of the unpaired sites.  Integers only.
"""

from typing import Final

import numpy as np

from sweepmill_worker.clifford.vectors import item, put
from sweepmill_worker.jit import part, step
from sweepmill_worker.program.kinds import PLACES as PLACES_KIND
from sweepmill_worker.program.tables import (
    FIRST,
    NO_STREAM,
    PAIRS,
    PLACES,
    SLOT,
    STREAM,
    STREAM_AT,
    STREAM_FROM,
    WIDTH,
    Desk,
    Tables,
)
from sweepmill_worker.words import fill

STREAM_BLOCKS: Final = 16
"""Blocks of a stream that are made at once."""
PROPOSALS: Final = 32
SCALE: Final = 18
"""Weights of the exact choice: the largest has 32 + 18 bits, so that 4096 of them stay below 2**62."""

_32 = np.uint64(32)
_LOW = np.uint64(0xFFFFFFFF)


@step
def draw_places(tables: Tables, desk: Desk, number: int, word: int, k: np.uint64, key: tuple[int, int]) -> None:
    """Rewrite the places of a step that draws them."""
    count, first = tables.steps[number, PLACES], tables.steps[number, FIRST]
    kind = PLACES_KIND + tables.steps[number, SLOT]
    desk.cursor[0] = 0
    if tables.steps[number, STREAM] == PAIRS:
        draw_pairs(tables, desk, number, kind, word, k, key)
        return
    source, many = tables.steps[number, STREAM_AT], np.uint64(tables.steps[number, STREAM_FROM])
    for place in range(count):
        chosen = source + np.int64((next_word(desk, kind, word, k, key) * many) >> _32)
        for site in range(tables.steps[number, WIDTH]):
            desk.places[first + place, site] = desk.places[chosen, site]


@part
def drawn_places(tables: Tables, number: int) -> bool:
    """Does the step draw its places?"""
    return bool(tables.steps[number, STREAM] != NO_STREAM)


@part
def draw_pairs(
    tables: Tables, desk: Desk, number: int, kind: int, word: int, k: np.uint64, key: tuple[int, int]
) -> None:
    """Disjoint pairs."""
    free, law, first = tables.sites, tables.steps[number, STREAM_AT], tables.steps[number, FIRST]
    for site in range(free):
        put(desk.free, site, site)
        put(desk.position, site, site)
    for pair in range(tables.steps[number, PLACES]):
        site = uniform_site(desk, free, kind, word, k, key)
        free = take(desk, site, free)
        if law < 0:
            partner = uniform_site(desk, free, kind, word, k, key)
        else:
            partner = proposed(tables, desk, law, site, kind, word, k, key)
            if partner < 0:
                partner = exact_choice(tables, desk, law, site, free, kind, word, k, key)
        free = take(desk, partner, free)
        desk.places[first + pair, 0] = site
        desk.places[first + pair, 1] = partner


@step
def next_word(desk: Desk, kind: int, word: int, k: np.uint64, key: tuple[int, int]) -> np.uint64:
    """The stream's next word."""
    at = desk.cursor[0] % (4 * STREAM_BLOCKS)
    if at == 0:
        for block in range(STREAM_BLOCKS):
            desk.stream_blocks[block] = (kind << 24) + desk.cursor[0] // 4 + block
        fill(desk.stream, desk.stream_blocks, desk.stream_layers, word, k, key)
    desk.cursor[0] += 1
    return np.uint64(item(desk.stream, at))


@step
def uniform_site(desk: Desk, free: int, kind: int, word: int, k: np.uint64, key: tuple[int, int]) -> int:
    """An unpaired site."""
    at = np.int64((next_word(desk, kind, word, k, key) * np.uint64(free)) >> _32)
    return int(item(desk.free, at))


@part
def take(desk: Desk, site: int, free: int) -> int:
    """Pair the site; how many are left?"""
    at, last = item(desk.position, site), item(desk.free, free - 1)
    put(desk.free, at, last)
    put(desk.position, last, at)
    put(desk.position, site, -1)
    return free - 1


@step
def below(total: np.uint64, desk: Desk, kind: int, word: int, k: np.uint64, key: tuple[int, int]) -> np.uint64:
    """A uniform integer below `total` < 2**63 from two words: (word * total) >> 64 for a word of 64 bits."""
    high, low = next_word(desk, kind, word, k, key), next_word(desk, kind, word, k, key)
    total_high, total_low = total >> _32, total & _LOW
    one, two = high * total_low, low * total_high
    carry = (((low * total_low) >> _32) + (one & _LOW) + (two & _LOW)) >> _32
    return high * total_high + (one >> _32) + (two >> _32) + carry


@part
def proposed(
    tables: Tables, desk: Desk, law: int, site: int, kind: int, word: int, k: np.uint64, key: tuple[int, int]
) -> int:
    """An unpaired partner by proposals; -1 if all missed."""
    last = tables.offsets.shape[1] - 1
    for _ in range(PROPOSALS):
        pick = below(tables.offsets[law, last], desk, kind, word, k, key)
        low, high = 0, last
        while low < high:
            middle = (low + high) >> 1
            if pick < tables.offsets[law, middle]:
                high = middle
            else:
                low = middle + 1
        forward = (site + low + 1) % tables.sites
        partner = forward if tables.periodic else site + low - (tables.sites - 1)
        if 0 <= partner < tables.sites and desk.position[partner] >= 0:
            return partner
    return -1


@part
def distance(tables: Tables, one: int, other: int) -> int:
    """Of two sites, along the shorter way of a ring."""
    apart = abs(one - other)
    return min(apart, tables.sites - apart) if tables.periodic else apart


@part
def exact_choice(
    tables: Tables, desk: Desk, law: int, site: int, free: int, kind: int, word: int, k: np.uint64, key: tuple[int, int]
) -> int:
    """An unpaired partner by the weights of all of them, in units of the largest."""
    least = 2**62
    for at in range(free):
        least = min(least, int(tables.shifts[law, distance(tables, site, desk.free[at])]))
    total = np.uint64(0)
    for at in range(free):
        total += relative_weight(tables, law, distance(tables, site, desk.free[at]), least)
    pick = below(total, desk, kind, word, k, key)
    for at in range(free):
        weight = relative_weight(tables, law, distance(tables, site, desk.free[at]), least)
        if pick < weight:
            return int(desk.free[at])
        pick -= weight
    return -1


@part
def relative_weight(tables: Tables, law: int, apart: int, least: int) -> np.uint64:
    """The weight of a distance, scaled so that the largest mantissa keeps 50 bits."""
    smaller = min(tables.shifts[law, apart] - least, 63)
    weight: np.uint64 = (tables.mantissas[law, apart] << np.uint64(SCALE)) >> np.uint64(smaller)
    return weight
