"""The compiled circuit as compiled code reads it: arrays of integers."""

from typing import Final, NamedTuple

import numpy as np
from numpy.typing import NDArray

# Columns of Tables.steps.  Steps are numbered depth-first, a choice before the steps of its branches.
CODE: Final = 0
"""A code of operations.py, or CHOOSE."""
WIDTH: Final = 1
"""Sites of a place."""
FIRST: Final = 2
"""First row of the step's places."""
PLACES: Final = 3
SLOT: Final = 4
FOLLOW: Final = 5
"""The step that is next for the same place; -1 if there is none."""
RATE_MODE: Final = 6
RATE_AT: Final = 7
RATE_PERIOD: Final = 8
PRIMARY_AT: Final = 9
"""First word of the decision whether, or which branch, counted from the layer's first word."""
GATE_AT: Final = 10
"""First word of the gates: counted from the layer's first word, or absolute if fixed."""
FIXED: Final = 11
CLASSES_AT: Final = 12
CLASSES: Final = 13
"""Number of classes a gate is drawn from; 0 for a definite gate."""
DETAIL: Final = 14
"""16 * class + frame of a definite gate; letters of a measurement; class of the gate that makes a Bell pair."""
ROTATED: Final = 15
FLAGS: Final = 16
REFERENCE: Final = 17
"""The reference site of place 0 of a swap-in."""
BRANCHES_AT: Final = 18
BRANCHES: Final = 19
STREAM: Final = 20
"""How places are drawn: NO_STREAM, PAIRS or SEQUENCE; children of a choice have the places of their parent."""
STREAM_AT: Final = 21
"""Pairs: row of the distance laws, -1 for a uniform law.  Sequence: first row of the places it draws from."""
STREAM_FROM: Final = 22
"""Sequence: number of places it draws from."""
ROAD: Final = 23
"""How the executor runs a whole step; see roads.py."""
PARITY: Final = 24
STEP_COLUMNS: Final = 25

CHOOSE: Final = 5

NO_STREAM, PAIRS, SEQUENCE = 0, 1, 2

# Modes of a rate or weight.
ALWAYS: Final = 0
BY_LAYER: Final = 1
"""levels[at + (layer - 1) % period]; a constant has period 1."""
BY_SITE: Final = 2
"""levels[at + first site of the place]"""
BY_DISORDER: Final = 3
"""drawn[at + place]"""

# Columns of Tables.branches.
MODE, AT, PERIOD, START = 0, 1, 2, 3

# Columns of Tables.disorder.
WORDS_AT, NUMBERS, TO, LAW, LOW, RANGE, SPLIT, CURVE = 0, 1, 2, 3, 4, 5, 6, 7
UNIFORM, TWO_VALUED, POWER_LAW = 0, 1, 2

# Columns of Tables.sequence.
LAYER_LIST, FILL_FROM, FILL_TO, BASE = 0, 1, 2, 3


class Tables(NamedTuple):
    """Read only."""

    steps: NDArray[np.int64]
    """[steps, STEP_COLUMNS]"""
    branches: NDArray[np.int64]
    """[branches, 4]: the weight's mode, position and period, and the first step."""
    tops: NDArray[np.int64]
    """The top-level steps of all lists of layers, one list after the other."""
    lists: NDArray[np.int64]
    """[lists + 1]: where each list of layers begins in `tops`."""
    sequence: NDArray[np.int64]
    """[before + span + after, 4]: list of layers, the blocks of words to fill when it is reached, its first word."""
    levels: NDArray[np.uint64]
    """Thresholds of rates and integer weights of branches."""
    classes: NDArray[np.int64]
    """Classes of random gates."""
    rotated: NDArray[np.int64]
    """[720, 4], or [0, 4] where nothing is rotated."""
    disorder: NDArray[np.int64]
    """[quenched rates and weights, 8]"""
    curves: NDArray[np.int64]
    """[power laws, nodes]"""
    blocks: NDArray[np.uint32]
    """First counter words of the blocks of words, layer after layer of `sequence`."""
    ahead: NDArray[np.uint32]
    """Per block, its layer counted from the one at which it is filled."""
    fixed_blocks: NDArray[np.uint32]
    """Blocks drawn once per trajectory (gates and disorder), then those drawn once per ensemble; and their layers."""
    fixed_layers: NDArray[np.uint32]
    offsets: NDArray[np.uint64]
    """[distance laws, 2 L]: cumulated weights of the offsets of a partner."""
    mantissas: NDArray[np.uint64]
    """[distance laws, L]: weight of a distance is its mantissa / 2 ** its shift."""
    shifts: NDArray[np.int64]
    sites: int
    before: int
    span: int
    """Layers of `repeat` after which the sequence starts again."""
    repeated: int
    periodic: bool
    trajectory_blocks: int
    """How many of the fixed blocks are drawn once per trajectory."""


class Desk(NamedTuple):
    """What drawing writes."""

    places: NDArray[np.int64]
    """[places, 4]: sites; the rows of random places are rewritten whenever they are drawn."""
    words: NDArray[np.uint32]
    """The fixed blocks, then those of the layers at hand."""
    drawn: NDArray[np.uint64]
    """Quenched rates and weights of the trajectory."""
    codes: NDArray[np.int64]
    """Of each operation its code: of a projection that belongs to a rotated gate plus 256 * (1 + its ordinal)."""
    acting: NDArray[np.int64]
    """Its step."""
    ordinals: NDArray[np.int64]
    """Its place in the step."""
    details: NDArray[np.int64]
    """Its gate, 16 * class + frame, or its letters."""
    ends: NDArray[np.int64]
    """Where the operations of each top-level step of the layer end."""
    free: NDArray[np.int64]
    """Sites not yet paired ..."""
    position: NDArray[np.int64]
    """... and where each stands among them, -1 for a paired one."""
    stream: NDArray[np.uint32]
    stream_blocks: NDArray[np.uint32]
    stream_layers: NDArray[np.uint32]
    cursor: NDArray[np.int64]
    """[1]: next word of the stream."""
