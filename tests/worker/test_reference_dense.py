"""The signed simulation against density matrices: states, signs and probabilities of every record of small circuits."""

import random
from itertools import product

import numpy as np
import pytest

from support import dense
from support.records import branches, dense_branch, outcomes_of
from support.rows import random_layer
from sweepmill_worker.program import operations as op
from sweepmill_worker.reference.trajectory import SignedTrajectory

QUBITS = 3
CLOSE = 1e-6  # gates come in single precision
CASES = [(seed, state) for seed in range(12) for state in ("zeros", "plus", "mixed")]


@pytest.mark.parametrize(("seed", "initial_state"), CASES)
def test_every_record_has_its_state_and_its_probability(seed: int, initial_state: str) -> None:
    rows = random_layer(random.Random(seed), QUBITS, 14, forced=False)
    found = [trajectory for trajectory, _ in branches([rows], QUBITS, initial_state)]
    records = list(map(outcomes_of, found))
    assert len(set(records)) == len(records)
    for trajectory, outcomes in zip(found, records, strict=True):
        exact = dense_branch([rows], QUBITS, initial_state, outcomes)
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
    found = [trajectory for trajectory, _ in branches([rows], QUBITS, "zeros")]
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
    exact = dense_branch([rows], QUBITS, "zeros", [])
    assert trajectory.record.measurements == []
    if trajectory.record.impossible:
        np.testing.assert_allclose(exact, 0, atol=CLOSE)
    else:
        probability = 2.0**trajectory.record.log2_forced
        np.testing.assert_allclose(np.trace(exact), probability, atol=CLOSE)
        state = dense.of_stabilizers(trajectory.state.stabilizers(), QUBITS)
        np.testing.assert_allclose(state, exact / probability, atol=CLOSE)
