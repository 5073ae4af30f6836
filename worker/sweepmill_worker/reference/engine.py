"""The signed simulation of a program, trajectory by trajectory."""

from collections.abc import Iterator
from typing import NamedTuple

from sweepmill_worker.program.compile import Program
from sweepmill_worker.program.listing import operations
from sweepmill_worker.reference.trajectory import SignedTrajectory, outcome_bits


class Played(NamedTuple):
    """A trajectory after one of its layers; the next one changes it."""

    number: int
    """1 - before .. 0, then 1 .. layers."""
    trajectory: SignedTrajectory
    random: int
    """Recorded measurements of the layer whose outcome was random."""
    measured: int
    """Recorded measurements of the layer, forced ones apart."""


def play(program: Program, key_words: tuple[int, int], k: int) -> Iterator[Played]:
    """Trajectory k of the program, layer by layer.

    key_words: the first two 32-bit words of the ensemble key.  Raises ValueError for too many qubits.
    """
    trajectory = SignedTrajectory(program.sites, program.references, program.initial_state)
    for layer in operations(program, key_words, k):
        counts = trajectory.play(layer.rows, layer.number, outcome_bits(key_words, layer.word, k))
        yield Played(layer.number, trajectory, *counts)
