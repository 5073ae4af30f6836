"""The signed simulation against density matrices: states, signs and probabilities of every record of small circuits."""

import random
from collections.abc import Iterator
from itertools import product

import numpy as np
import pytest
from numpy.typing import NDArray

from support import dense
from support.rows import random_layer
from sweepmill_worker.program import operations as op
from sweepmill_worker.reference.trajectory import SignedTrajectory

QUBITS = 3
CLOSE = 1e-6  # gates come in single precision
CASES = [(seed, state) for seed in range(12) for state in ("zeros", "plus", "mixed")]


def branches(rows: NDArray[np.int32], initial_state: str) -> Iterator[SignedTrajectory]:
    """Every trajectory of one circuit: random outcomes by all sequences of bits, as far as they are asked for."""
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

        trajectory = SignedTrajectory(QUBITS, 0, initial_state)
        trajectory.play(rows, 1, bit)
        yield trajectory


def dense_branch(rows: NDArray[np.int32], initial_state: str, outcomes: list[int]) -> dense.Matrix:
    """The state after these outcomes, its trace their probability; forced outcomes are +1."""
    state = dense.start(initial_state, QUBITS)
    left = iter(outcomes)
    for row in rows.tolist():
        recorded = row[op.CODE] == op.MEASURE and row[op.FLAGS] == op.RECORDED
        state = dense.apply(state, row, QUBITS, next(left) if recorded else 0)
    return state


@pytest.mark.parametrize(("seed", "initial_state"), CASES)
def test_every_record_has_its_state_and_its_probability(seed: int, initial_state: str) -> None:
    rows = random_layer(random.Random(seed), QUBITS, 14, forced=False)
    found = list(branches(rows, initial_state))
    records = [tuple(one.outcome for one in trajectory.record.measurements) for trajectory in found]
    assert len(set(records)) == len(records)
    for trajectory, outcomes in zip(found, records, strict=True):
        exact = dense_branch(rows, initial_state, list(outcomes))
        probability = 2.0**trajectory.record.log2_probability
        np.testing.assert_allclose(np.trace(exact), probability, atol=CLOSE)
        state = dense.of_stabilizers(trajectory.state.stabilizers(), QUBITS)
        np.testing.assert_allclose(state, exact / probability, atol=CLOSE)
    # Post-selection costs the same for all records of one circuit: 2^r of them, all equally probable.
    assert {trajectory.record.log2_probability for trajectory in found} == {-(len(found).bit_length() - 1)}
    assert len(found) == 2 ** (len(found).bit_length() - 1)


@pytest.mark.parametrize("seed", range(12))
def test_the_average_over_records_is_the_circuit_with_its_outcomes_lost(seed: int) -> None:
    rows = random_layer(random.Random(100 + seed), QUBITS, 12, forced=False)
    lost = rows.copy()
    lost[:, op.FLAGS] = 0
    unread = SignedTrajectory(QUBITS, 0, "zeros")
    unread.play(lost, 1, lambda kind, place: pytest.fail("nothing is measured"))
    found = list(branches(rows, "zeros"))
    for letters in product("_XYZ", repeat=QUBITS):
        sites = [site for site, letter in enumerate(letters) if letter != "_"]
        pauli = ("".join(letters).replace("_", ""), tuple(sites))
        if sites:
            total = sum(trajectory.state.expectation(pauli) for trajectory in found)
            assert total == len(found) * unread.state.expectation(pauli)


@pytest.mark.parametrize("seed", range(20))
def test_forced_outcomes_have_their_states_and_probabilities(seed: int) -> None:
    rows = random_layer(random.Random(200 + seed), QUBITS, 12)
    rows[:, op.FLAGS] = np.where(rows[:, op.FLAGS] == op.RECORDED, op.RECORDED | op.FORCED, rows[:, op.FLAGS])
    trajectory = SignedTrajectory(QUBITS, 0, "zeros")
    trajectory.play(rows, 1, lambda kind, place: pytest.fail("every outcome is forced"))
    exact = dense_branch(rows, "zeros", [])
    assert trajectory.record.measurements == []
    if trajectory.record.impossible:
        np.testing.assert_allclose(exact, 0, atol=CLOSE)
    else:
        probability = 2.0**trajectory.record.log2_forced
        np.testing.assert_allclose(np.trace(exact), probability, atol=CLOSE)
        state = dense.of_stabilizers(trajectory.state.stabilizers(), QUBITS)
        np.testing.assert_allclose(state, exact / probability, atol=CLOSE)
