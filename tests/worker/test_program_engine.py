"""The executor against the engine of the hybrid chain, bit for bit, and what its states promise between layers."""

import random
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray

from support.programs import Form, form, hybrid
from support.stim_oracle import rank
from sweepmill_worker.clifford.commutators import new_matrix
from sweepmill_worker.clifford.elimination import new_desk as new_reading_desk
from sweepmill_worker.clifford.engine import HybridChain, Readings, run
from sweepmill_worker.clifford.roads import plan
from sweepmill_worker.clifford.state import State
from sweepmill_worker.clifford.trajectories import Results
from sweepmill_worker.observables.probes import of_regions
from sweepmill_worker.program.compile import MAX_SITES, compile_program
from sweepmill_worker.program.execute import run_trajectories
from sweepmill_worker.program.listing import new_desk
from sweepmill_worker.program.products import roomy_state
from sweepmill_worker.program.run import circuit_of, run_program

KEY = (11, 12)


def equal(a: Readings, b: Readings) -> None:
    np.testing.assert_array_equal(a.random, b.random)
    np.testing.assert_array_equal(a.measured, b.measured)
    np.testing.assert_array_equal(a.entropies, b.entropies)


def some_regions(sites: int) -> list[tuple[int, ...]]:
    draw = random.Random(sites)
    cuts = [tuple(range(x)) for x in range(0, sites + 1, max(1, sites // 8))]
    arcs = [tuple(sorted((first + i) % sites for i in range(sites // 3))) for first in range(0, sites, 5)]
    return [*cuts, *arcs, *(tuple(sorted(draw.sample(range(sites), sites // 2))) for _ in range(4))]


@pytest.mark.parametrize("mixed", [False, True])
@pytest.mark.parametrize(
    ("sites", "periodic", "count"),
    [(2, True, 300), (9, False, 200), (32, True, 60), (64, True, 20), (100, True, 5), (131, False, 4), (300, True, 2)],
)
def test_the_hybrid_chain_comes_out_as_from_its_own_engine(sites: int, periodic: bool, count: int, mixed: bool) -> None:
    more = {} if periodic else {"boundary": "open"}
    more |= {"initial_state": "mixed"} if mixed else {}
    program = compile_program(hybrid(sites, 30, 0.13, **more))
    chain = HybridChain(sites, 30, periodic, mixed, int(0.13 * 2**32))
    arguments = (KEY, 2**32 - 1, count, [1, 2, 17, 30], some_regions(sites))
    equal(run_program(program, *arguments), run(chain, *arguments))


def test_a_chain_with_references_purifies_like_a_mixed_one() -> None:
    """A reference for every site is the purification of the maximally mixed state: same circuit, same entropies."""
    sites, regions = 10, [tuple(range(x)) for x in range(11)]
    swap = {"swap_in": "reference", "on": "sites"}
    mixed = compile_program(hybrid(sites, 25, 0.2, initial_state="mixed"))
    program = compile_program(hybrid(sites, 25, 0.2, before=[[swap]]))
    assert (program.mixed, program.total) == (False, 20)
    layers = range(1, 26)
    equal(run_program(program, KEY, 0, 60, layers, regions), run_program(mixed, KEY, 0, 60, layers, regions))
    references, everything = tuple(range(10, 20)), tuple(range(20))
    found = run_program(program, KEY, 0, 60, layers, [tuple(range(10)), references, everything]).entropies
    np.testing.assert_array_equal(found[..., 0], found[..., 1])
    assert not found[..., 2].any()


def anything(sites: int, boundary: str, loses: bool) -> Form:
    """A circuit with steps of every kind."""
    lost: list[dict[str, Any]] = []
    if loses:
        lost += [{"depolarise": True, "on": "sites", "rate": 0.02}, {"reset": True, "on": {"places": [[1]]}}]
    first: list[dict[str, Any]] = [
        {"apply": "uniform-clifford", "on": {"random_pairs": {"count": "all", "exponent": 2}}},
        {"measure": "XYZ", "on": {"blocks": {"width": 3}}, "rate": 0.05},
        {"apply": "cz", "on": "bonds", "rate": 0.3},
        {"measure": "ZY", "on": "bonds", "rate": 0.1},
    ]
    second: list[dict[str, Any]] = [
        {"apply": "uniform-clifford", "on": "bonds-from-0", "rate": 0.7},
        {"apply": "uniform-clifford", "on": "bonds-from-1", "rotated": True},
        {
            "choose": [{"weight": 1, "steps": [{"measure": "X"}]}, {"weight": 3, "steps": [{"apply": "h"}]}],
            "on": "sites",
        },
        {"measure": "Y", "on": {"random_sequential": {"count": 3, "of": "sites"}}, "recorded": not loses},
    ]
    return form(sites, 9, [first + lost, second], boundary=boundary)


@pytest.mark.parametrize("loses", [False, True])
@pytest.mark.parametrize(("sites", "boundary"), [(6, "open"), (8, "periodic"), (32, "periodic"), (300, "periodic")])
def test_rows_stay_independent_and_commuting_inside_their_windows(sites: int, boundary: str, loses: bool) -> None:
    program = compile_program(anything(sites, boundary, loses))
    state, lanes = roomy_state(program.total, program.mixed)
    results = Results(np.zeros((1, 0, 0), np.int32), np.zeros((1, 9), np.int32), np.zeros((1, 9), np.int32))
    run_trajectories(
        state,
        new_reading_desk(roomy_state(program.total, program.mixed)[0]),
        new_matrix(state, lanes, wanted=False),
        circuit_of(program, KEY),
        program.tables,
        new_desk(program, KEY),
        plan(of_regions(program.sites, [], program.references), program.mixed),
        np.zeros(0, dtype=np.int64),
        np.uint64(3),
        results,
        lanes,
    )
    check_rows(state, len(lanes), program.total)


def check_rows(state: State, width: int, sites: int) -> None:
    blocks = state.columns.reshape(state.chunks, state.stride, width)[:, : 2 * sites]
    rows = np.concatenate([np.array([bits(column) for column in block]).T for block in blocks])
    stabilizer, logical = bits(state.stabilizers).astype(bool), bits(state.logicals).astype(bool)
    assert not (stabilizer & logical).any()
    assert 2 * stabilizer.sum() + logical.sum() == 2 * sites
    assert not rows[~(stabilizer | logical)].any()
    used = np.flatnonzero(stabilizer | logical)
    assert rank(int.from_bytes(np.packbits(rows[row]).tobytes(), "big") for row in used) == len(used)
    xs, zs = rows[:, 0::2].astype(int), rows[:, 1::2].astype(int)
    expected, pairs = np.zeros((len(rows), len(rows)), dtype=int), np.flatnonzero(logical)
    expected[pairs, state.partner[pairs]] = 1
    np.testing.assert_array_equal((xs @ zs.T + zs @ xs.T) % 2, expected)
    for row in used:
        start, end = int(state.start[row]), int(state.end[row])
        assert 0 <= start <= end < start + sites
        assert start < sites
        assert bits(state.wrapping)[row] == (end >= sites)
        support = np.flatnonzero(rows[row, 0::2] | rows[row, 1::2])
        assert ((support - start) % sites <= end - start).all()


def bits(words: NDArray[np.uint64]) -> NDArray[np.uint8]:
    return np.unpackbits(words.view(np.uint8), bitorder="little")


def test_what_cannot_run_is_refused_by_name() -> None:
    with pytest.raises(ValueError, match=f"sites: at most {MAX_SITES}, got {MAX_SITES + 2}"):
        compile_program(hybrid(MAX_SITES + 2, 1, 0.5))
    swap = {"swap_in": "reference", "on": {"places": [[0], [1]]}}
    with pytest.raises(ValueError, match=f"sites: at most {MAX_SITES - 2} beside 2 references"):
        compile_program(hybrid(MAX_SITES, 1, 0.5, before=[[swap]]))
    program = compile_program(hybrid(8, 3, 0.5))
    for arguments, name in (
        ((KEY, 0, 1, [4], []), "read_layers"),
        ((KEY, 0, 1, [2, 1], []), "read_layers"),
        ((KEY, -1, 1, [], []), "first"),
        ((KEY, 0, 1, [], [(0, 8)]), "regions"),
        (((0, 2**32), 0, 1, [], []), "key_words"),
    ):
        with pytest.raises(ValueError, match=name):
            run_program(program, *arguments)
