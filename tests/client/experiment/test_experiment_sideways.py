"""The laboratory of a rotated circuit, against the compiled programs of both readings and exact averages."""

from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray
from scipy import stats

from support.budget import chi_square_limit, z_limit
from sweepmill import Ensemble, Sweep
from sweepmill.experiment import Sideways, held_sites, laboratory, sideways_circuit, window_purity
from sweepmill.observation import Entropy, RecordBits
from sweepmill.presets import layered_form
from sweepmill_worker.program import operations as op
from sweepmill_worker.program.compile import compile_program
from sweepmill_worker.program.listing import operations
from sweepmill_worker.sample import sample

CIRCUITS = [sideways_circuit(window) for window in (1, 2, 3, 4, 7, 8)] + [Sideways(5, 9, 2, 6), Sideways(4, 7, 3, 3)]


def rows_of(ensemble: Ensemble) -> list[NDArray[np.int32]]:
    """Rows of operations of trajectory 0, a list for each layer."""
    program = compile_program(layered_form(ensemble))
    return [layer.rows for layer in operations(program, ensemble.key_words, 0)]


def laboratory_ensemble(circuit: Sideways) -> Ensemble:
    fields: dict[str, Any] = {"observe": [{"quantity": "entropy", "at": "end"}], "stop": {"trajectories": 1}}
    return Sweep.parse({"circuit": laboratory(circuit), **fields}).points[0].ensemble


def rotated_ensemble(circuit: Sideways) -> Ensemble:
    return Ensemble.of("rotated-clifford", sites=circuit.layers + 1, layers=circuit.columns)


def pairs(rows: NDArray[np.int32]) -> list[tuple[int, int]]:
    wide = rows[rows[:, op.SITES] == 2]
    return [(int(row[op.SITE]), int(row[op.SITE + 1])) for row in wide]


@pytest.mark.parametrize("circuit", CIRCUITS, ids=str)
def test_the_counts_are_those_of_the_compiled_laboratory(circuit: Sideways) -> None:
    layers = rows_of(laboratory_ensemble(circuit))
    rows = np.concatenate(layers)
    gates = rows[rows[:, op.CODE] == op.GATE]
    inside = [pair for pair in pairs(gates) if max(pair) < circuit.chain]
    edge = [pair for pair in pairs(gates) if max(pair) >= circuit.chain]
    assert len(layers) == circuit.layers + 1  # one to prepare
    assert len(inside) == circuit.gates
    assert len(edge) == circuit.taken_out + circuit.bell_pairs
    assert sorted({max(pair) for pair in edge}) == held_sites(circuit)
    assert (gates[:, op.SITES] == 1).sum() == circuit.bell_pairs
    assert op.MEASURE not in rows[:, op.CODE]
    assert len(held_sites(circuit)) == circuit.window


@pytest.mark.parametrize("circuit", CIRCUITS, ids=str)
def test_the_rotated_circuit_has_the_same_gates_column_by_column(circuit: Sideways) -> None:
    """Every gate of the brickwork stands once in a column, and every final leg is traced at the top of one."""
    layers = rows_of(rotated_ensemble(circuit))[1:]
    assert len(layers) == circuit.columns
    assert sum(len(set(pairs(rows))) for rows in layers) == circuit.gates
    top = [
        rows for rows in layers if ((rows[:, op.CODE] == op.DEPOLARISE) & (rows[:, op.SITE] == circuit.layers)).any()
    ]
    # each such column traces the leg of one site of the chain and lets in the partner of the next one's; where the
    # first column is one of them, the slice it finds at the top is the leg of none
    assert 2 * len(top) - circuit.columns % 2 == circuit.final_legs


def entropies(ensemble: Ensemble, region: list[int], trajectories: int) -> NDArray[np.int64]:
    """Number of trajectories with each entropy of a region, 0 to its size."""
    observed = Entropy(quantity="entropy", region=tuple(region), at="end", histogram=True)
    rows = sample(ensemble, [observed], 0, trajectories).accumulators[observed.key].histogram
    assert rows is not None
    found = np.zeros(len(region) + 1, np.int64)
    found[rows[:, 1]] = rows[:, 2:].sum(axis=1)
    return found


@pytest.mark.parametrize("circuit", CIRCUITS[1:], ids=str)
def test_the_held_slices_are_entangled_as_those_of_the_rotated_circuit(circuit: Sideways) -> None:
    """The same law from either reading; false alarms: one chi-square of the share "paid" each."""
    ours = entropies(laboratory_ensemble(circuit), held_sites(circuit), 1500)
    theirs = entropies(rotated_ensemble(circuit), list(circuit.held), 1500)
    both = np.stack([ours, theirs])[:, (ours + theirs) >= 10]
    assert both.sum() > 2900
    result = stats.chi2_contingency(both, correction=False)
    assert result.statistic < chi_square_limit("paid", 40, max(1, result.dof))


@pytest.mark.parametrize("window", [1, 2, 3, 4, 5])
def test_the_mean_purity_of_the_laboratory_is_the_exact_one(window: int) -> None:
    circuit = sideways_circuit(window)
    counts = entropies(laboratory_ensemble(circuit), held_sites(circuit), 1500)
    purities = np.repeat(2.0 ** -np.arange(window + 1), counts)
    error = stats.sem(purities)
    exact_mean = window_purity(window)
    assert abs(purities.mean() - exact_mean) <= z_limit("paid", 40) * error + 1e-12


def test_window_purities_are_those_of_the_recursion_for_two_walls() -> None:
    """Odd windows of slices in the steady state, from the average of two copies of a gate (Operator spreading in random
    unitary circuits, Phys. Rev. X 8, 021014 (2018), arXiv:1705.08975: twirl with weight 2/5), computed separately."""
    expected = [0.5, 0.2, 0.092, 0.04544, 0.023456, 0.012482048]
    assert [window_purity(w) for w in (1, 3, 5, 7, 9, 11)] == pytest.approx(expected, rel=1e-9)
    assert [window_purity(w) for w in (2, 4)] == pytest.approx([0.4, 0.184], rel=1e-12)
    slope = -np.log2(window_purity(2001) / window_purity(1001)) - 1.5 * np.log2(2001 / 1001)
    assert slope / 1000 == pytest.approx(np.log2(5 / 4), rel=1e-3)


def test_the_smallest_patch_is_the_light_cone_of_its_window() -> None:
    circuit = sideways_circuit(16)
    assert (circuit.chain, circuit.layers, circuit.held) == (9, 15, range(16))
    assert (circuit.taken_out, circuit.bell_pairs, circuit.qubits, circuit.final_legs) == (8, 8, 25, 8)
    assert circuit.to_dict()["post_selected_bits_if_traced"] == 0
    assert Sideways(3, 15, 0, 16).log2_purity is None


@pytest.mark.parametrize("counts", [(0, 3, 0, 2), (2, 4, 0, 2), (2, 3, 1, 4), (2, 3, -1, 2), (2, 3, 0, 0)])
def test_counts_that_do_not_fit_together_are_refused(counts: tuple[int, int, int, int]) -> None:
    with pytest.raises(ValueError, match=r"got|are not among"):
        Sideways(*counts)


@pytest.mark.parametrize("mixed", [True, False])
def test_projecting_the_chain_costs_at_most_a_bit_for_each_of_its_legs(mixed: bool) -> None:
    """From a mixed start every final outcome is random, for a unital circuit keeps the chain maximally mixed."""
    circuit = sideways_circuit(6)
    block = laboratory(circuit)
    if not mixed:
        block["before"] = [block["before"][0][1:]]
    block["after"] = [[{"measure": "Z", "on": {"places": [[site] for site in range(1, circuit.chain)]}}]]
    observe = [{"quantity": "record-bits", "at": "end", "histogram": True}]
    projected = Sweep.parse({"circuit": block, "observe": observe, "stop": {"trajectories": 1}}).points[0].ensemble
    observed = RecordBits(quantity="record-bits", at="end")
    total = sample(projected, [observed], 0, 300).accumulators[observed.key]
    assert total.maximum[0, 0] <= circuit.final_legs
    assert (total.minimum[0, 0] == circuit.final_legs) == mixed
