"""How the executor runs a whole step, decided once: what is the same for all of its operations."""

from typing import Final

from sweepmill_worker.program import tables as t
from sweepmill_worker.program.operations import GATE, MEASURE, RECORDED
from sweepmill_worker.program.places import Where

ONE_BY_ONE: Final = 0
"""Operation by operation."""
BRICKS: Final = 1
"""A gate on every bond of one parity: all windows grow to the boundaries of the bricks at once."""
SOME_BRICKS: Final = 2
"""Gates on some bonds of one parity."""
SITES: Final = 3
"""Recorded measurements of single sites."""


def road(row: list[int], at: Where, sites: int, periodic: bool) -> tuple[int, int]:
    """(road, parity of the bonds' left sites) of a top-level step.

    Neighbours of one parity need no look at single windows; measurements of single sites are the other common load.
    """
    if row[t.CODE] == MEASURE and at.width == 1 and row[t.FLAGS] == RECORDED:
        return SITES, 0
    if row[t.CODE] != GATE or row[t.ROTATED] or at.width != 2 or not at.fixed or (periodic and sites % 2):
        return ONE_BY_ONE, 0
    parity = at.fixed[0][0] % 2
    bricks = [(left, (left + 1) % sites) for left in range(parity, sites if periodic else sites - 1, 2)]
    if list(at.fixed) == bricks and row[t.RATE_MODE] == t.ALWAYS:
        return BRICKS, parity
    if len(set(at.fixed)) == len(at.fixed) and set(at.fixed) <= set(bricks):
        return SOME_BRICKS, parity
    return ONE_BY_ONE, 0
