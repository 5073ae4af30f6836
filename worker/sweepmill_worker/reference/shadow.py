"""The same circuit from another initial state: can it leave the same record?"""

from collections.abc import Sequence
from itertools import islice

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.program import operations as op
from sweepmill_worker.reference.record import Measurement, Record
from sweepmill_worker.reference.trajectory import SignedTrajectory


class Shadow:
    """Follows the record of a trajectory: same gates and places, and its outcomes wherever both are possible.

    Once an outcome is certain here and another one there, the record has probability 0, and so has every longer one.
    """

    def __init__(self, sites: int, references: int, initial_state: str) -> None:
        """As `SignedTrajectory`."""
        self._own = SignedTrajectory(sites, references, initial_state)
        self.agrees = True
        """Whether the record so far is possible."""

    def follow(self, rows: NDArray[np.int32], number: int, record: Record) -> None:
        """Do the operations of a layer whose outcomes are the last of the record."""
        if not self.agrees:
            return
        done = len(self._own.record.measurements)
        theirs = list(islice(record.measurements, done, None))
        outcomes = _by_word(rows, theirs)
        self._own.play(rows, number, lambda kind, place: outcomes[kind, place])
        own = self._own.record.measurements[done:]
        self.agrees = all(a.outcome == b.outcome for a, b in zip(own, theirs, strict=True))


def _by_word(rows: NDArray[np.int32], measurements: Sequence[Measurement]) -> dict[tuple[int, int], int]:
    """Outcomes by the kind and place of their words."""
    recorded = rows[(rows[:, op.CODE] == op.MEASURE) & (rows[:, op.FLAGS] == op.RECORDED)]
    words = recorded[:, [op.KIND, op.PLACE]].tolist()
    return {(kind, place): one.outcome for (kind, place), one in zip(words, measurements, strict=True)}
