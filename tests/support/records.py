"""Every record that a small circuit can leave."""

from collections.abc import Iterator, Sequence

import numpy as np
from numpy.typing import NDArray

from support import dense
from sweepmill_worker.program import operations as op
from sweepmill_worker.reference.shadow import Shadow
from sweepmill_worker.reference.trajectory import SignedTrajectory

Layers = Sequence[NDArray[np.int32]]
"""Operations, see program/operations.py; references wait behind the sites of the chain."""


def branches(
    layers: Layers, sites: int, initial_state: str, references: int = 0, against: Sequence[str] = ()
) -> Iterator[tuple[SignedTrajectory, list[list[bool]]]]:
    """Every trajectory of one circuit: random outcomes by all sequences of bits, as far as they are asked for.

    With it, for each layer, whether its record so far is possible from other initial states.
    """
    pending: list[tuple[int, ...]] = [()]
    while pending:
        decided = pending.pop()
        asked = 0

        def bit(kind: int, place: int, decided: tuple[int, ...] = decided) -> int:
            nonlocal asked
            asked += 1
            if asked > len(decided):
                pending.append((*decided, *(0 for _ in range(asked - 1 - len(decided))), 1))
            return decided[asked - 1] if asked <= len(decided) else 0

        trajectory = SignedTrajectory(sites, references, initial_state)
        shadows = [Shadow(sites, references, state) for state in against]
        agreements = []
        for number, rows in enumerate(layers, 1):
            trajectory.play(rows, number, bit)
            for shadow in shadows:
                shadow.follow(rows, number, trajectory.record)
            agreements.append([shadow.agrees for shadow in shadows])
        yield trajectory, agreements


def outcomes_of(trajectory: SignedTrajectory) -> tuple[int, ...]:
    """Its record."""
    return tuple(one.outcome for one in trajectory.record.measurements)


def dense_branch(layers: Layers, sites: int, initial_state: str, outcomes: Sequence[int]) -> dense.Matrix:
    """The state after these outcomes, its trace their probability; forced outcomes are +1."""
    state = dense.start(initial_state, sites)
    left = iter(outcomes)
    for row in np.concatenate(layers).tolist():
        recorded = row[op.CODE] == op.MEASURE and row[op.FLAGS] == op.RECORDED
        state = dense.apply(state, row, sites, next(left) if recorded else 0)
    return state


def probability(layers: Layers, sites: int, initial_state: str, outcomes: Sequence[int]) -> float:
    """Of a record, by the rules of quantum mechanics."""
    return float(np.trace(dense_branch(layers, sites, initial_state, outcomes)).real)
