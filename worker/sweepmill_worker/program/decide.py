"""One decision at one place, from its random word."""

import numpy as np

from sweepmill_worker.clifford.vectors import item
from sweepmill_worker.jit import part
from sweepmill_worker.program.tables import (
    ALWAYS,
    AT,
    BRANCHES,
    BRANCHES_AT,
    BY_DISORDER,
    BY_SITE,
    CLASSES,
    CLASSES_AT,
    DETAIL,
    FIRST,
    FIXED,
    FOLLOW,
    GATE_AT,
    MODE,
    PERIOD,
    PRIMARY_AT,
    RATE_AT,
    RATE_MODE,
    RATE_PERIOD,
    START,
    WIDTH,
    Desk,
    Tables,
)

_32 = np.uint64(32)
_LOW = np.uint64(0xFFFFFFFF)


@part
def level(tables: Tables, desk: Desk, step: int, place: int, index: int, mode: int, at: int, period: int) -> np.uint64:
    """The integer of a rate or weight at a place in a layer."""
    if mode == BY_DISORDER:
        found: np.uint64 = desk.drawn[at + place]
    elif mode == BY_SITE:
        found = tables.levels[at + desk.places[tables.steps[step, FIRST] + place, 0]]
    else:
        found = tables.levels[at + (index - 1) % period]
    return found


@part
def threshold(tables: Tables, desk: Desk, step: int, place: int, index: int) -> np.uint64:
    """A word below this makes it happen."""
    row = tables.steps[step]
    return level(tables, desk, step, place, index, row[RATE_MODE], row[RATE_AT], row[RATE_PERIOD])


@part
def happens(tables: Tables, desk: Desk, step: int, place: int, base: int, index: int) -> bool:
    """Does the step act on the place?"""
    if tables.steps[step, RATE_MODE] == ALWAYS:
        return True
    word = np.uint64(item(desk.words, base + tables.steps[step, PRIMARY_AT] + place))
    return bool(word < threshold(tables, desk, step, place, index))


@part
def branch_weight(tables: Tables, desk: Desk, branch: int, step: int, place: int, index: int) -> np.uint64:
    """The weight of a branch at a place."""
    row = tables.branches[branch]
    return level(tables, desk, step, place, index, row[MODE], row[AT], row[PERIOD])


@part
def chosen_step(tables: Tables, desk: Desk, step: int, place: int, base: int, index: int) -> int:
    """The first step of the branch that a choice takes; what follows the choice where all weights are zero."""
    first, count = tables.steps[step, BRANCHES_AT], tables.steps[step, BRANCHES]
    total = np.uint64(0)
    for branch in range(first, first + count):
        total += branch_weight(tables, desk, branch, step, place, index)
    word = np.uint64(0)
    if count > 1:
        word = np.uint64(item(desk.words, base + tables.steps[step, PRIMARY_AT] + place))
    pick = word * (total >> _32) + ((word * (total & _LOW)) >> _32)  # (word * total) >> 32
    for branch in range(first, first + count):
        weight = branch_weight(tables, desk, branch, step, place, index)
        if pick < weight:
            return int(tables.branches[branch, START])
        pick -= weight
    return int(tables.steps[step, FOLLOW])


@part
def detail_of_gate(tables: Tables, desk: Desk, step: int, place: int, base: int) -> int:
    """16 * class + frame of the gate at a place.

    The high part of word * (number of classes) is the class, the low one the frame: independent to 2**-32 of a unit.
    """
    count = tables.steps[step, CLASSES]
    if count == 0:
        return int(tables.steps[step, DETAIL])
    at = tables.steps[step, GATE_AT] + place + (0 if tables.steps[step, FIXED] else base)
    product = np.uint64(item(desk.words, at)) * np.uint64(count)
    chosen = item(tables.classes, tables.steps[step, CLASSES_AT] + np.int64(product >> _32))
    frame = ((product & _LOW) << np.uint64(2 * tables.steps[step, WIDTH])) >> _32
    return int(chosen << 4 | np.int64(frame))
