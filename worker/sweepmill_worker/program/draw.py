"""Draw one layer of one trajectory: everything random about it, as a list of operations.

The places of a step are handled in order, step after step; of a choice, all that happens at a place before the next.
"""

import numpy as np

from sweepmill_worker.clifford.vectors import item, put
from sweepmill_worker.jit import entry, part
from sweepmill_worker.program.decide import chosen_step, detail_of_gate, happens, threshold
from sweepmill_worker.program.operations import GATE, MEASURE
from sweepmill_worker.program.streams import draw_places, drawn_places
from sweepmill_worker.program.tables import (
    ALWAYS,
    BASE,
    BY_LAYER,
    CHOOSE,
    CLASSES,
    CODE,
    CURVE,
    DETAIL,
    FILL_FROM,
    FILL_TO,
    FIXED,
    FOLLOW,
    GATE_AT,
    LAW,
    LAYER_LIST,
    LOW,
    NUMBERS,
    PLACES,
    POWER_LAW,
    PRIMARY_AT,
    RANGE,
    RATE_MODE,
    ROTATED,
    SPLIT,
    TO,
    UNIFORM,
    WORDS_AT,
    Desk,
    Tables,
)
from sweepmill_worker.words import fill

PROJECTION = 256
"""Added to the code of a projection that belongs to a rotated gate, times 1 + its ordinal."""

ALL_PAIRS = 720
"""Classes of a uniform gate on two sites: their table is the identity."""

_32 = np.uint64(32)


@part
def begin_trajectory(tables: Tables, desk: Desk, k: np.uint64, key: tuple[int, int]) -> None:
    """Draw what is drawn once per trajectory: words of fixed gates, quenched rates and weights."""
    blocks = tables.trajectory_blocks
    if blocks:
        fill(desk.words, tables.fixed_blocks[:blocks], tables.fixed_layers[:blocks], 0, k, key)
    for row in range(len(tables.disorder)):
        for number in range(tables.disorder[row, NUMBERS]):
            word = int(item(desk.words, tables.disorder[row, WORDS_AT] + number))
            desk.drawn[tables.disorder[row, TO] + number] = np.uint64(quenched(tables, row, word))


@part
def quenched(tables: Tables, row: int, word: int) -> int:
    """One rate or weight from its word."""
    low, span = tables.disorder[row, LOW], tables.disorder[row, RANGE]
    if tables.disorder[row, LAW] == UNIFORM:
        return int(low + np.int64((np.uint64(span) * np.uint64(word)) >> _32))
    if tables.disorder[row, LAW] == POWER_LAW:
        return on_curve(tables, tables.disorder[row, CURVE], word + 1)
    return int(low + (span if word < tables.disorder[row, SPLIT] else 0))


@part
def on_curve(tables: Tables, curve: int, argument: int) -> int:
    """A power law at 1 .. 2**32, interpolated between its nodes."""
    octave = 0
    while argument >> octave >= 512:
        octave += 1
    node = 256 * octave + (argument >> octave)
    below, rest = tables.curves[curve, node], argument & ((1 << octave) - 1)
    if rest == 0:
        return int(below)
    return int(below + (((tables.curves[curve, node + 1] - below) * rest) >> octave))


@part
def draw_layer(tables: Tables, desk: Desk, row: int, index: int, word: int, k: np.uint64, key: tuple[int, int]) -> int:
    """Draw the layer in row `row` of the sequence; how many operations?

    index: what profiles by layer count.  word: the layer's number in the counters of the words.
    """
    begin, end, base = tables.sequence[row, FILL_FROM], tables.sequence[row, FILL_TO], tables.sequence[row, BASE]
    if begin < end:
        fill(desk.words[base:], tables.blocks[begin:end], tables.ahead[begin:end], word, k, key)
    count, first = 0, tables.lists[tables.sequence[row, LAYER_LIST]]
    for ordinal in range(tables.lists[tables.sequence[row, LAYER_LIST] + 1] - first):
        top = tables.tops[first + ordinal]
        if drawn_places(tables, top):
            draw_places(tables, desk, top, word, k, key)
        count = draw_step(tables, desk, top, base, index, count)
        desk.ends[ordinal] = count
    return count


@part
def draw_step(tables: Tables, desk: Desk, top: int, base: int, index: int, count: int) -> int:
    """Append the operations of a top-level step; how many are there now?"""
    code, mode = tables.steps[top, CODE], tables.steps[top, RATE_MODE]
    if code == GATE and mode == ALWAYS and not tables.steps[top, ROTATED]:
        return draw_gates(tables, desk, top, base, count)
    if code == MEASURE and mode == BY_LAYER:
        return draw_measurements(tables, desk, top, base, index, count)
    for place in range(tables.steps[top, PLACES]):
        here = top
        while here >= 0:
            if tables.steps[here, CODE] == CHOOSE:
                here = chosen_step(tables, desk, here, place, base, index)
            else:
                if happens(tables, desk, here, place, base, index):
                    count = append(tables, desk, here, place, base, count)
                here = tables.steps[here, FOLLOW]
    return count


@part
def draw_gates(tables: Tables, desk: Desk, top: int, base: int, count: int) -> int:
    """A gate on every place."""
    beyond = count + tables.steps[top, PLACES]
    if tables.steps[top, CLASSES] == ALL_PAIRS and not tables.steps[top, FIXED]:
        at = base + tables.steps[top, GATE_AT] - count
        for row in range(count, beyond):  # the class stands for itself: 16 * class + frame in one product
            word = np.uint64(item(desk.words, at + row))
            put(desk.details, row, np.int64((word * np.uint64(16 * ALL_PAIRS)) >> _32))
    else:
        for row in range(count, beyond):
            put(desk.details, row, detail_of_gate(tables, desk, top, row - count, base))
    for row in range(count, beyond):
        put(desk.ordinals, row, row - count)
    label(desk, count, beyond, GATE, top)
    return int(beyond)


@part
def draw_measurements(tables: Tables, desk: Desk, top: int, base: int, index: int, count: int) -> int:
    """Measurements at one rate for all places: written without a branch, kept or overwritten by the next."""
    limit, beyond = threshold(tables, desk, top, 0, index), count
    at = base + tables.steps[top, PRIMARY_AT]
    for place in range(tables.steps[top, PLACES]):
        put(desk.ordinals, beyond, place)
        beyond += int(np.uint64(item(desk.words, at + place)) < limit)
    for row in range(count, beyond):
        put(desk.details, row, tables.steps[top, DETAIL])
    label(desk, count, beyond, MEASURE, top)
    return beyond


@part
def label(desk: Desk, first: int, beyond: int, code: int, here: int) -> None:
    """Operations of one step."""
    for row in range(first, beyond):
        put(desk.codes, row, code)
        put(desk.acting, row, here)


@part
def append(tables: Tables, desk: Desk, here: int, place: int, base: int, count: int) -> int:
    """Append what a step does at a place."""
    code, detail = tables.steps[here, CODE], tables.steps[here, DETAIL]
    if code == GATE and tables.steps[here, CLASSES]:
        detail = detail_of_gate(tables, desk, here, place, base)
    if tables.steps[here, ROTATED]:
        cell = detail >> 4
        projections = tables.rotated[cell, 0]
        for ordinal in range(projections):
            write(
                desk,
                count + ordinal,
                MEASURE + PROJECTION * (1 + ordinal),
                here,
                place,
                tables.rotated[cell, 1 + ordinal],
            )
        count += projections
        detail = tables.rotated[cell, 3] << 4 | detail & 15
    write(desk, count, code, here, place, detail)
    return int(count + 1)


@part
def write(desk: Desk, row: int, code: int, here: int, place: int, detail: int) -> None:
    """One operation."""
    put(desk.codes, row, code)
    put(desk.acting, row, here)
    put(desk.ordinals, row, place)
    put(desk.details, row, detail)


@entry
def draw_once(tables: Tables, desk: Desk, k: np.uint64, key: tuple[int, int]) -> None:
    """`begin_trajectory` for Python."""
    begin_trajectory(tables, desk, k, key)


@entry
def draw(tables: Tables, desk: Desk, row: int, index: int, word: int, k: np.uint64, key: tuple[int, int]) -> int:
    """`draw_layer` for Python."""
    return draw_layer(tables, desk, row, index, word, k, key)
