"""The signed simulation of a program: trajectory by trajectory, and as an engine that reads probes."""

from collections.abc import Iterator, Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.clifford.engine import Readings
from sweepmill_worker.observables.probes import Probes
from sweepmill_worker.observables.rows import read_rows
from sweepmill_worker.program.compile import Program
from sweepmill_worker.program.listing import operations
from sweepmill_worker.reference.rows import rows_of
from sweepmill_worker.reference.shadow import Shadow
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


def play(program: Program, key_words: tuple[int, int], k: int, shadows: Sequence[Shadow] = ()) -> Iterator[Played]:
    """Trajectory k of the program, layer by layer, and whoever follows its record.

    key_words: the first two 32-bit words of the ensemble key.  Raises ValueError for too many qubits.
    """
    trajectory = SignedTrajectory(program.sites, program.references, program.initial_state)
    for layer in operations(program, key_words, k):
        counts = trajectory.play(layer.rows, layer.number, outcome_bits(key_words, layer.word, k))
        for shadow in shadows:
            shadow.follow(layer.rows, layer.number, trajectory.record)
        yield Played(layer.number, trajectory, *counts)


def run_reference(
    program: Program, key_words: tuple[int, int], first: int, count: int, read_layers: Sequence[int], probes: Probes
) -> Readings:
    """Sample trajectories first .. first + count - 1, as the executor does.

    Besides, what only signs can give: Pauli expectations, and whether a record is possible from other initial states.
    Arguments as of the executor; read_layers: ascending, 1 .. program.layers.  Raises ValueError for too many qubits
    and for probes that a stabilizer state does not answer.
    """
    readings = Readings(
        np.zeros((count, len(read_layers), probes.size), dtype=np.int32),
        np.zeros((count, program.layers), dtype=np.int32),
        np.zeros((count, program.layers), dtype=np.int32),
    )
    at = {number: index for index, number in enumerate(read_layers)}
    for index in range(count):
        shadows = [Shadow(program.sites, program.references, state) for state in probes.against]
        for number, trajectory, random, measured in play(program, key_words, first + index, shadows):
            if number > 0:
                readings.random[index, number - 1] = random
                readings.measured[index, number - 1] = measured
            if number in at:
                readings.entropies[index, at[number]] = _read(trajectory, probes, shadows)
    return readings


def _read(trajectory: SignedTrajectory, probes: Probes, shadows: Sequence[Shadow]) -> NDArray[np.int32]:
    state = trajectory.state
    rows = rows_of(state.stabilizers(), state.qubits)
    expectations = [state.expectation((pauli.letters, pauli.sites)) for pauli in probes.paulis]
    agreements = [int(shadow.agrees) for shadow in shadows]
    return read_rows(rows.x.astype(np.uint8), rows.z.astype(np.uint8), probes, expectations, agreements)
