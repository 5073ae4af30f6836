"""What the state promises between layers: independent commuting rows (I1) inside their windows (I2)."""

import numpy as np
import pytest
from numpy.typing import NDArray

from support.stim_oracle import rank
from sweepmill_worker.clifford.commutators import new_matrix
from sweepmill_worker.clifford.elimination import new_desk
from sweepmill_worker.clifford.engine import MASKS
from sweepmill_worker.clifford.roads import plan
from sweepmill_worker.clifford.slots import new_census
from sweepmill_worker.clifford.state import Lanes, State, new_state
from sweepmill_worker.clifford.trajectories import Circuit, Results, new_supply, run_batch
from sweepmill_worker.observables.probes import Probes


def final_state(sites: int, layers: int, periodic: bool, mixed: bool, rate: float) -> tuple[State, Lanes]:
    state, lanes = new_state(sites, mixed)
    results = Results(np.zeros((1, 0, 0), np.int32), np.zeros((1, layers), np.int32), np.zeros((1, layers), np.int32))
    run_batch(
        state,
        new_desk(new_state(sites, mixed)[0]),
        new_matrix(state, lanes, wanted=False),
        Circuit(layers, periodic, mixed, int(rate * 2**32), MASKS, (1, 2)),
        new_supply(sites),
        new_census(state),
        plan(Probes(sites), mixed),
        np.zeros(0, dtype=np.int64),
        np.uint64(3),
        results,
        lanes,
    )
    return state, lanes


def bits(words: NDArray[np.uint64]) -> NDArray[np.uint8]:
    return np.unpackbits(words.view(np.uint8), bitorder="little")


def rows_of(state: State, lanes: Lanes) -> NDArray[np.uint8]:
    """[slot, column]"""
    blocks = state.columns.reshape(state.chunks, state.stride, len(lanes))[:, : 2 * state.sites]
    return np.concatenate([np.array([bits(column) for column in block]).T for block in blocks])


CASES = [
    (sites, layers, periodic, mixed, rate)
    for sites, periodic in ((2, True), (7, False), (64, True), (65, False), (150, True), (300, True))
    for mixed in (False, True)
    for layers, rate in ((1, 0.5), (24, 0.1), (41, 0.25))
] + [(600, 100, True, False, 0.25), (1030, 70, False, False, 0.3), (600, 70, False, True, 0.3)]


@pytest.mark.parametrize(("sites", "layers", "periodic", "mixed", "rate"), CASES)
def test_rows_are_independent_commute_and_stay_in_their_windows(
    sites: int, layers: int, periodic: bool, mixed: bool, rate: float
) -> None:
    state, lanes = final_state(sites, layers, periodic, mixed, rate)
    rows = rows_of(state, lanes)
    stabilizer, logical = bits(state.stabilizers).astype(bool), bits(state.logicals).astype(bool)
    assert not (stabilizer & logical).any()
    assert 2 * stabilizer.sum() + logical.sum() == 2 * sites
    assert not rows[~(stabilizer | logical)].any()
    used = np.flatnonzero(stabilizer | logical)
    assert rank(int.from_bytes(np.packbits(rows[row]).tobytes(), "big") for row in used) == len(used)
    xs, zs = rows[:, 0::2].astype(np.float32), rows[:, 1::2].astype(np.float32)  # exact, and far faster than integers
    anticommuting = (xs @ zs.T + zs @ xs.T).astype(int) % 2
    expected = np.zeros_like(anticommuting)
    pairs = np.flatnonzero(logical)
    expected[pairs, state.partner[pairs]] = 1
    np.testing.assert_array_equal(anticommuting, expected)
    check_windows(state, rows, used)
    check_marks(state, rows)


def check_windows(state: State, rows: NDArray[np.uint8], used: NDArray[np.int64]) -> None:
    wrapping = bits(state.wrapping).astype(bool)
    for row in used:
        start, end = int(state.start[row]), int(state.end[row])
        assert 0 <= start < state.sites
        assert start <= end < start + state.sites
        assert wrapping[row] == (end >= state.sites)
        support = np.flatnonzero(rows[row, 0::2] | rows[row, 1::2])
        assert ((support - start) % state.sites <= end - start).all()


def check_marks(state: State, rows: NDArray[np.uint8]) -> None:
    chunks = np.arange(len(rows)) // (len(rows) // state.chunks)
    acting = rows[:, 0::2] | rows[:, 1::2]
    for chunk in range(state.chunks):
        sites = np.flatnonzero(acting[chunks == chunk].any(axis=0))
        assert all(int(state.marks[chunk]) >> (int(site) >> state.block) & 1 for site in sites)


def marked_blocks(state: State) -> int:
    blocks = ((state.sites - 1) >> state.block) + 1
    return sum((int(marks) & ((1 << blocks) - 1)).bit_count() for marks in state.marks)


def test_rows_of_neighboring_sites_share_chunks() -> None:
    state, _ = final_state(2000, 64, True, False, 0.3)
    blocks = ((state.sites - 1) >> state.block) + 1
    assert state.chunks == 4
    assert marked_blocks(state) < 2 * blocks  # 4 without sorting; a quarter and the margins for each chunk with it
