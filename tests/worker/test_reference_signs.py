"""Signs and outcomes of the signed simulation against what is known of a few states."""

import numpy as np
import pytest

from support.rows import row, table
from support.signed import entropies
from sweepmill_worker.circuit_text.gates import named_gates
from sweepmill_worker.program import operations as op
from sweepmill_worker.reference.rows import rows_of
from sweepmill_worker.reference.state import MOST_QUBITS, SignedState
from sweepmill_worker.reference.trajectory import SignedTrajectory, outcome_bits
from sweepmill_worker.words import words

KEY = (0x5EED0001, 0x0BADCAFE)


def gate(name: str, *sites: int) -> list[int]:
    """The row of a gate that is one named gate."""
    qubits = tuple(range(len(sites)))
    classes = range(720 if len(sites) == 2 else 6)
    frames = range(4 ** len(sites))
    return next(
        row(op.GATE, sites, c, f) for c in classes for f in frames if named_gates(c, f, len(sites)) == ((name, qubits),)
    )


def ghz(sites: int) -> list[list[int]]:
    return [gate("H", 0), *(gate("CX", 0, site) for site in range(1, sites))]


def measured(letters: str, *sites: int, place: int = 0) -> list[int]:
    return row(op.MEASURE, sites, letters=letters, flags=op.RECORDED, place=place)


def test_sites_of_a_ghz_state_agree_and_are_up_in_half_of_the_trajectories() -> None:
    """|ups - 500| < 80 of 1000 fails by accident with probability 4e-7 (normal law, 5.06 standard deviations)."""
    rows = table([*ghz(4), *(measured("Z", site, place=site) for site in range(4))])
    ups = 0
    for k in range(1000):
        trajectory = SignedTrajectory(4, 0, "zeros")
        assert trajectory.play(rows, 1, outcome_bits(KEY, 1, k)) == (1, 4)
        outcomes = {one.outcome for one in trajectory.record.measurements}
        assert len(outcomes) == 1
        assert trajectory.record.log2_probability == -1
        ups += outcomes == {0}
    assert abs(ups - 500) < 80


@pytest.mark.parametrize(("letters", "sign"), [("XXX", 1), ("XYY", -1), ("YXY", -1), ("YYX", -1), ("ZZY", 0)])
def test_a_ghz_state_contradicts_local_realism(letters: str, sign: int) -> None:
    """Source: What's wrong with these elements of reality?, Physics Today 43 (6), 9 (1990)."""
    trajectory = SignedTrajectory(3, 0, "zeros")
    trajectory.play(table(ghz(3)), 1, outcome_bits(KEY, 1, 0))
    assert trajectory.state.expectation((letters, (0, 1, 2))) == sign
    if sign:
        assert trajectory.play(table([measured(letters, 0, 1, 2)]), 2, outcome_bits(KEY, 2, 0)) == (0, 1)
        assert trajectory.record.measurements[0].outcome == (1 - sign) // 2


def test_an_outcome_is_the_top_bit_of_the_word_of_its_row() -> None:
    k = 2**40 + 3
    rows = table([*(gate("H", site) for site in range(6)), *(measured("Z", site, place=site) for site in range(6))])
    trajectory = SignedTrajectory(6, 0, "zeros")
    trajectory.play(rows, 7, outcome_bits(KEY, 2**31 + 5, k))
    drawn = words(KEY, 96, 2**31 + 5, k, 6) >> 31
    assert [one.outcome for one in trajectory.record.measurements] == drawn.tolist()
    assert {(one.layer, one.letters, one.random) for one in trajectory.record.measurements} == {(7, "Z", True)}


def test_a_forced_outcome_that_is_impossible_in_this_frame_is_taken_in_the_other() -> None:
    forced = row(op.MEASURE, [0, 1], letters="ZZ", flags=op.RECORDED | op.FORCED)
    bits = outcome_bits(KEY, 1, 0)
    signs = []
    for frame in range(16):
        trajectory = SignedTrajectory(2, 0, "zeros")
        counts = trajectory.play(table([*ghz(2), row(op.GATE, [0, 1], IDENTITY, frame), forced]), 1, bits)
        flipped = trajectory.state.expectation(("ZZ", (0, 1))) == -1
        assert (counts, trajectory.record.log2_forced, trajectory.record.impossible) == ((0, 0), 0, flipped)
        signs.append(flipped)
    assert sum(signs) == 8
    halved = SignedTrajectory(2, 0, "plus")
    halved.play(table([forced]), 1, bits)
    assert (halved.record.log2_forced, halved.record.impossible, halved.record.log2_probability) == (-1, 0, 0)
    assert halved.state.expectation(("ZZ", (0, 1))) == 1


IDENTITY = next(c for c in range(720) if not named_gates(c, 0, 2))


def test_a_site_that_is_swapped_in_is_entangled_with_its_reference_alone() -> None:
    rows = table([gate("X", 0), row(op.SWAP_IN, [0, 2]), row(op.SWAP_IN, [1, 3])])
    trajectory = SignedTrajectory(2, 2, "mixed")
    trajectory.play(rows, 0, outcome_bits(KEY, 2**32 - 1, 0))
    regions = [(2, 3), (0, 1), (0, 2), (1, 3), (0, 1, 2, 3)]
    assert entropies(trajectory.state.stabilizers(), 4, regions) == [2, 2, 0, 0, 0]
    for letters in ("XX", "ZZ"):
        assert trajectory.state.expectation((letters, (0, 2))) == 1


def test_the_environment_is_made_anew_without_changing_the_state() -> None:
    state = SignedState([], 3)
    state.reset(0)
    state.reset(2)
    state.pair(0, 2)
    for _ in range(300):
        state.depolarize(1)
        state.dephase(("XX", (0, 2)))
    assert [str(one) for one in state.stabilizers()] == ["+X_X", "+Z_Z"]
    state.dephase(("ZX", (0, 1)))
    assert [str(one) for one in state.stabilizers()] == ["+Z_Z"]
    assert state.expectation(("ZZ", (0, 2))) == 1


def test_a_chain_that_is_too_long_for_the_signed_simulation_is_refused() -> None:
    with pytest.raises(ValueError, match=f"at most {MOST_QUBITS} qubits, got {MOST_QUBITS + 1}"):
        SignedTrajectory(MOST_QUBITS, 1, "zeros")


def test_signs_of_rows_are_kept() -> None:
    trajectory = SignedTrajectory(2, 0, "zeros")
    trajectory.play(table([gate("X", 1)]), 1, outcome_bits(KEY, 1, 0))
    generators = rows_of(trajectory.state.stabilizers(), 2)
    np.testing.assert_array_equal(generators.signs, [False, True])
    np.testing.assert_array_equal(generators.z, np.eye(2, dtype=bool))
    assert not generators.x.any()
