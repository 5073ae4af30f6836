"""The circuit of one trajectory as rows of operations, made by the routine that the executor uses."""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.program import operations as op
from sweepmill_worker.program import tables as t
from sweepmill_worker.program.compile import Program
from sweepmill_worker.program.draw import draw, draw_once
from sweepmill_worker.program.kinds import ENSEMBLE_TRAJECTORY, OUTCOME
from sweepmill_worker.program.streams import STREAM_BLOCKS
from sweepmill_worker.words import fill


@dataclass(frozen=True)
class LayerOperations:
    """One layer of one trajectory."""

    number: int
    """1 - before .. 0 for the layers before, then 1 .. layers."""
    word: int
    """Its layer in the counters of random words."""
    rows: NDArray[np.int32]
    """[n, 12]: the operations in order, see operations.py."""


def operations(program: Program, key_words: tuple[int, int], k: int) -> Iterator[LayerOperations]:
    """Everything that happens in trajectory k, layer by layer.

    key_words: the first two 32-bit words of the ensemble key.
    """
    desk = new_desk(program, key_words)
    draw_once(program.tables, desk, np.uint64(k), key_words)
    for number in range(1 - program.before, program.layers + 1):
        index = number + program.before if number <= 0 else number
        word = number if number > 0 else (number - 1) % 2**32
        count = draw(program.tables, desk, program.entry(number), index, word, np.uint64(k), key_words)
        yield LayerOperations(number, word, _rows(program.tables, desk, count))


def new_desk(program: Program, key_words: tuple[int, int]) -> t.Desk:
    """Room for drawing, with the words of gates that are drawn once per ensemble."""
    tables = program.tables
    desk = t.Desk(
        places=program.places.copy(),
        words=np.zeros(program.words, np.uint32),
        drawn=np.zeros(program.drawn, np.uint64),
        codes=np.zeros(program.most_operations + 1, np.int64),
        acting=np.zeros(program.most_operations + 1, np.int64),
        ordinals=np.zeros(program.most_operations + 1, np.int64),
        details=np.zeros(program.most_operations + 1, np.int64),
        ends=np.zeros(int(np.diff(tables.lists).max()) + 1, np.int64),
        free=np.zeros(program.sites, np.int64),
        position=np.zeros(program.sites, np.int64),
        stream=np.zeros(4 * STREAM_BLOCKS, np.uint32),
        stream_blocks=np.zeros(STREAM_BLOCKS, np.uint32),
        stream_layers=np.zeros(STREAM_BLOCKS, np.uint32),
        cursor=np.zeros(1, np.int64),
    )
    once = tables.trajectory_blocks
    blocks, layers = tables.fixed_blocks[once:], tables.fixed_layers[once:]
    fill(desk.words[4 * once :], blocks, layers, 0, np.uint64(ENSEMBLE_TRAJECTORY), key_words)
    return desk


def _rows(tables: t.Tables, desk: t.Desk, count: int) -> NDArray[np.int32]:
    code, step, place, detail = (part[:count] for part in (desk.codes, desk.acting, desk.ordinals, desk.details))
    steps, code, projection = tables.steps[step], code & 255, code >> 8
    rows = np.zeros((count, op.COLUMNS), np.int32)
    rows[:, op.CODE], rows[:, op.SITES] = code, steps[:, t.WIDTH]
    rows[:, op.SITE : op.SITE + op.WIDEST] = desk.places[steps[:, t.FIRST] + place]
    gates, measures, swaps = code == op.GATE, code == op.MEASURE, code == op.SWAP_IN
    rows[gates, op.CLASS], rows[gates, op.FRAME] = detail[gates] >> 4, detail[gates] & 15
    rows[measures, op.LETTERS] = detail[measures]
    rows[:, op.FLAGS] = np.where(projection > 0, op.RECORDED | op.FORCED, steps[:, t.FLAGS])
    rows[swaps, op.SITE + 1] = (steps[:, t.REFERENCE] + place)[swaps]
    rows[:, op.KIND] = OUTCOME + steps[:, t.SLOT]
    rows[:, op.PLACE] = np.where(projection > 0, 3 * place + projection - 1, place)
    return rows
