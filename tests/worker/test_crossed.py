"""Cross-entropy of two initial states, against sums over every record of small circuits.

Source of the definition: Cross entropy benchmark for measurement-induced phase transitions, Physical Review Letters
130, 220404 (2023).
"""

import random
from itertools import product

import numpy as np
import pytest

from support.budget import z_limit
from support.programs import hybrid
from support.random_programs import random_ensemble
from support.records import Layers, branches, outcomes_of, probability
from support.rows import random_layer, row, table
from sweepmill.coordinates import coordinates
from sweepmill.ensemble import Ensemble
from sweepmill.observation import Observation, observation_from_normal_form
from sweepmill.observation.crossed import CHI_UNIT
from sweepmill.statistics import summarize
from sweepmill_worker.crossed import chi_of
from sweepmill_worker.engines import program_of
from sweepmill_worker.observables.probes import Probes
from sweepmill_worker.program import operations as op
from sweepmill_worker.program.compile import compile_program
from sweepmill_worker.program.listing import operations
from sweepmill_worker.reference.engine import run_reference
from sweepmill_worker.sample import sample, trajectory_values

STATES = ("zeros", "plus", "mixed")
AGAINST = ("zeros", "plus")
KEY = (0x0123ABCD, 0xDEADBEEF)
SITES = 4


def crossed(against: str = "plus", **fields: object) -> Observation:
    return observation_from_normal_form({"quantity": "cross-entropy", "revision": 1, "against": against, **fields})


def random_circuit(seed: int, sites: int) -> Layers:
    """Three layers with at most 16 records."""
    draw = random.Random(seed)
    while True:
        layers = [random_layer(draw, sites, 5, forced=False, mixing=seed % 2 == 0) for _ in range(3)]
        if random_outcomes(layers, "mixed", sites)[-1] <= 4:
            return layers


def random_outcomes(layers: Layers, initial_state: str, sites: int) -> np.ndarray:
    """Up to each layer; which record it is does not matter."""
    trajectory, _ = next(branches(layers, sites, initial_state))
    layer_of = [one.layer for one in trajectory.record.measurements if one.random]
    return np.array([sum(layer <= n for layer in layer_of) for n in range(1, len(layers) + 1)])


def dense_chi(layers: Layers, sites: int, initial_state: str, against: str) -> float:
    """The definition: sum of p q over sum of q^2, by density matrices; records of one distribution or both."""
    records = {outcomes_of(found) for state in (initial_state, against) for found, _ in branches(layers, sites, state)}
    p, q = (np.array([probability(layers, sites, s, m) for m in sorted(records)]) for s in (initial_state, against))
    np.testing.assert_allclose([p.sum(), q.sum()], 1, atol=1e-5)
    return float((p * q).sum() / (q * q).sum())


@pytest.mark.parametrize("seed", [0, 2, 3])
def test_the_mean_over_all_records_is_chi_of_density_matrices_for_each_prefix(seed: int) -> None:
    layers = random_circuit(seed, 3)
    for initial_state, (place, against) in product(STATES, enumerate(AGAINST)):
        found = [agreements for _, agreements in branches(layers, 3, initial_state, against=AGAINST)]
        means = np.mean(found, axis=0)[:, place]
        exact = [dense_chi(layers[:n], 3, initial_state, against) for n in (1, 2, 3)]
        np.testing.assert_allclose(means, exact, atol=1e-5)
        if initial_state == against:
            assert means.tolist() == [1, 1, 1]


@pytest.mark.parametrize("seed", range(8))
def test_random_outcomes_from_two_initial_states_give_chi_of_the_circuit(seed: int) -> None:
    layers = random_circuit(100 + seed, SITES)
    bits = {state: random_outcomes(layers, state, SITES) for state in STATES}
    for initial_state, (place, against) in product(STATES, enumerate(AGAINST)):
        if initial_state != against:
            found = [agreements for _, agreements in branches(layers, SITES, initial_state, against=AGAINST)]
            means = np.mean(found, axis=0)[:, place]
            assert means.tolist() == (0.5 ** (bits["mixed"] - bits[against])).tolist()


CASES = [
    (Ensemble.of("hybrid-clifford", sites=4, measurement_rate=0.3, layers=3, scrambling_layers=3), "plus"),
    (Ensemble.of("hybrid-clifford", sites=4, measurement_rate=0.4, layers=3, initial_state="mixed"), "zeros"),
    (Ensemble.of("hybrid-clifford", sites=4, measurement_rate=0.3, layers=3, references=2), "plus"),
    (Ensemble.of("hybrid-clifford-long-range", sites=4, exponent=1, measurement_rate=0.4, layers=3), "plus"),
    (Ensemble.of("hybrid-clifford-square", width=2, height=2, measurement_rate=0.4, layers=3, boundary="open"), "plus"),
    *((random_ensemble(seed, 4, 3), "zeros") for seed in (24, 136, 395)),  # few records, chi below 1
    *((random_ensemble(seed, 4, 3), "plus") for seed in (69, 175)),
]


@pytest.mark.parametrize(("ensemble", "against"), CASES)
def test_the_sign_free_value_of_a_trajectory_is_its_circuits_mean_over_all_records(
    ensemble: Ensemble, against: str
) -> None:
    item, program = crossed(against, at=[1, 2, 3]), program_of(ensemble)
    least = 1.0
    for k in range(1 if ensemble.family == "layered" else 4):
        layers = [layer.rows for layer in operations(program, ensemble.key_words, k)]
        found = branches(layers, program.sites, ensemble.initial_state, ensemble.references, against=[against])
        means = np.mean([agreements for _, agreements in found], axis=0)[program.before :, 0]
        values = [one["value"] for one in trajectory_values(ensemble, [item], k)[0]["values"]]
        assert values == means[:3].tolist()
        least = min(least, *values)
    assert least < 1


def test_the_signed_value_of_a_trajectory_is_whether_its_own_record_is_possible() -> None:
    """Other observations in the same pass change nothing, and the values are 0 or 1 of ever longer records."""
    program = compile_program(hybrid(SITES, 5, 0.5))
    both = run_reference(program, KEY, 0, 40, [1, 3, 5], Probes(SITES, against=("plus", "zeros"))).entropies
    alone = run_reference(program, KEY, 20, 20, [5], Probes(SITES, against=("plus",))).entropies
    np.testing.assert_array_equal(both[20:, 2, 0], alone[:, 0, 0])
    assert (both[:, :, 1] == 1).all()  # the circuit's own initial state
    assert (np.diff(both[:, :, 0], axis=1) <= 0).all()
    assert 0 < both[:, 2, 0].sum() < 40


def test_a_gate_and_a_measurement_of_both_its_sites_leave_three_quarters() -> None:
    """By hand: of the 15 maximal sets of commuting products of two qubits one is the stabilizer group of plus itself,
    6 share one product with it and 8 none, so that chi is (1/4 + 6/2 + 8) / 15.
    """
    measured = [row(op.MEASURE, [site], letters="Z", flags=op.RECORDED, place=site) for site in (0, 1)]
    total = 0.0
    for gate in range(720):
        layers = [table([row(op.GATE, [0, 1], gate), *measured])]
        total += float(np.mean([agreements for _, agreements in branches(layers, 2, "zeros", against=["plus"])]))
    assert total / 720 == 0.75


def z_values(ensemble: Ensemble, count: int, expected: dict[int, float]) -> list[float]:
    """Deviations from what is expected at some layers, in standard errors."""
    item = crossed(at=sorted(expected))
    rows = summarize(sample(ensemble, [item], 0, count).accumulators[item.key], coordinates(ensemble, item))
    return [(one.mean - expected[n]) / one.standard_error for n, one in zip(sorted(expected), rows, strict=True)]


def test_chi_of_circuits_that_measure_everything() -> None:
    """Without encoding, L/2 independent gates, each as above, and pure states ever after: (3/4)^(L/2).

    After long scrambling the record reads a random stabilizer group out. Of those [L, d] 2^((L-d)(L-d+1)/2) share 2^d
    elements with a given one, [L, d] the binomial coefficient to base 2 (counting of isotropic subspaces, from memory);
    weighted with 2^-d the binomial theorem to base 2 makes (2^(L+1) + 1) / (3 2^L) of it, 2/3 for long chains.
    """
    settings = {"sites": 8, "measurement_rate": 1, "layers": 3}
    bare = Ensemble.of("hybrid-clifford", **settings)
    scrambled = Ensemble.of("hybrid-clifford", **settings, scrambling_layers=40)
    found = [
        *z_values(bare, 4000, {1: 0.75**4, 3: 0.75**4}),
        *z_values(scrambled, 4000, {1: 513 / 768, 3: 513 / 768}),
    ]
    assert max(map(abs, found)) < z_limit("cross-entropy", 6)


def test_signs_and_their_absence_have_the_same_mean_in_a_preset_and_its_layered_form() -> None:
    """Independent circuits, because the engine is part of the key: 16 z-values of two means."""
    bricks = [[{"apply": "uniform-clifford", "on": f"bonds-from-{n}"}] for n in (0, 1)]
    repeat = [[*layer, {"measure": "Z", "on": "sites", "rate": 0.3}] for layer in bricks]
    item = crossed(at=[1, 4])
    settings = {"sites": 6, "layers": 4}
    rows = []
    for engine, count in (("reference", 100), ("auto", 4000)):
        preset = Ensemble.of("hybrid-clifford", measurement_rate=0.3, scrambling_layers=2, engine=engine, **settings)
        written = Ensemble.of("layered", before=bricks, repeat=repeat, engine=engine, **settings)
        for ensemble in (preset, written):
            total = sample(ensemble, [item], 0, count).accumulators[item.key]
            rows.append(summarize(total, coordinates(ensemble, item)))
    signed, others = rows[:2], rows[2:]
    for a, b in [*product(signed, others), tuple(others)]:
        for one, other in zip(a, b, strict=True):
            error = np.hypot(one.standard_error, other.standard_error)
            assert abs(one.mean - other.mean) < z_limit("cross-entropy", 16) * error
    assert all(row[1].mean < 0.95 for row in rows)


def test_larger_rings_hide_their_beginning_below_the_transition_and_tell_it_above() -> None:
    """The transition is at a rate of 0.16: Critical properties of the measurement-induced transition in random quantum
    circuits, Physical Review B 101, 060301 (2020). The differences are 6 standard errors or more.
    """
    item = crossed()
    for rate, sign in ((0.08, 1), (0.22, -1)):
        found = []
        for sites in (8, 24):
            settings = {"sites": sites, "measurement_rate": rate, "layers": 2 * sites, "scrambling_layers": 48}
            ensemble = Ensemble.of("hybrid-clifford", **settings)
            total = sample(ensemble, [item], 0, 1500).accumulators[item.key]
            found += summarize(total, coordinates(ensemble, item))
        small, large = found
        assert sign * (large.mean - small.mean) > 0
        assert large.mean > 0.97 if sign > 0 else 2 / 3 < large.mean < 0.75


@pytest.mark.parametrize("engine", ["auto", "reference"])
def test_without_measurements_all_initial_states_are_alike(engine: str) -> None:
    ensemble = Ensemble.of("hybrid-clifford", sites=6, measurement_rate=0, layers=4, engine=engine)
    assert [one["value"] for one in trajectory_values(ensemble, [crossed()], 3)[0]["values"]] == [1.0]
    bath = Ensemble.of("edge-bath", sites=5, layers=6, engine=engine)
    assert [one["value"] for one in trajectory_values(bath, [crossed()], 0)[0]["values"]] == [1.0]


def test_any_split_of_a_range_gives_the_same_total() -> None:
    item = crossed(at={"every": 2})
    for engine in ("auto", "reference"):
        ensemble = Ensemble.of("hybrid-clifford", sites=4, measurement_rate=0.3, layers=4, engine=engine)
        whole, first, rest = (sample(ensemble, [item], *part) for part in ((0, 12), (0, 5), (5, 7)))
        merged = first.accumulators[item.key].merge(rest.accumulators[item.key])
        assert merged.digest == whole.accumulators[item.key].digest
        assert whole.accumulators[item.key].maximum.max() == 2 * (1 if engine == "reference" else CHI_UNIT)


def test_smaller_powers_than_the_unit_are_zero() -> None:
    assert chi_of(np.array([0, 1, 30, 31, 64, 1000])).tolist() == [CHI_UNIT, CHI_UNIT // 2, 1, 0, 0, 0]
