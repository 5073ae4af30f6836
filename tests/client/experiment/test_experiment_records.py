"""Records of small circuits counted outright, and their numbers against exact averages."""

from collections.abc import Iterator

import numpy as np
import pytest
import stim
from numpy.typing import NDArray
from scipy import stats

from support.budget import z_limit
from support.paid import sampled_source
from support.stabilizer_enumeration import ExactChain, measure, orbit, reduced
from sweepmill import Ensemble, Sweep
from sweepmill.experiment import Cost, cost_of
from sweepmill.experiment.birthday import exact
from sweepmill.experiment.counted import gates_until, measurements_until
from sweepmill.observation import RecordBits
from sweepmill_worker.circuit_text.write import circuit_text
from sweepmill_worker.sample import sample

SMALL = Ensemble.of("hybrid-clifford", sites=4, measurement_rate=0.4, layers=5)
BITS = RecordBits(quantity="record-bits", at="end")


def random_outcomes(k: int) -> int:
    return int(sample(SMALL, [BITS], k, 1).accumulators[BITS.key].sums[0, 0])


def records(text: str) -> Iterator[float]:
    """Probability of every record that can occur, by following both outcomes of every measurement that is random."""
    instructions = [one for one in stim.Circuit(text).flattened() if one.name != "TICK"]
    steps = [(one.name, group) for one in instructions for group in one.target_groups()]
    pending = [(stim.TableauSimulator(), 0, 1.0)]
    while pending:
        simulator, done, chance = pending.pop()
        while done < len(steps) and steps[done][0] != "M":
            simulator.do(stim.CircuitInstruction(steps[done][0], steps[done][1]))
            done += 1
        if done == len(steps):
            yield chance
            continue
        qubit = steps[done][1][0].value
        if simulator.peek_z(qubit):
            pending.append((simulator, done + 1, chance))
            continue
        for outcome in (False, True):
            branch = simulator.copy()
            branch.postselect_z(qubit, desired_value=outcome)
            pending.append((branch, done + 1, chance / 2))


@pytest.mark.parametrize("k", range(6))
def test_a_circuit_has_two_to_the_r_records_of_equal_probability(k: int) -> None:
    r = random_outcomes(k)
    found = list(records(circuit_text(SMALL, k, "stim")))
    assert found == [2.0**-r] * 2**r


def test_runs_until_a_record_occurs_twice_are_those_of_the_birthday_problem() -> None:
    """Sequences of records drawn by stim; false alarms: one comparison of the share "paid"."""
    k = next(k for k in range(100) if random_outcomes(k) == 6)
    shots = stim.Circuit(circuit_text(SMALL, k, "stim")).compile_sampler(seed=5).sample(60_000)
    codes = np.unique(shots, axis=0, return_inverse=True)[1].ravel()
    assert len(set(codes.tolist())) == 2**6
    waits = list(_waits(codes.tolist()))
    z = (np.mean(waits) - exact(2**6)) / stats.sem(waits)
    assert abs(z) < z_limit("paid", 40)


def _waits(codes: list[int]) -> Iterator[int]:
    seen: set[int] = set()
    for code in codes:
        if code in seen:
            yield len(seen) + 1
            seen = set()
        else:
            seen.add(code)


def series(sites: int, rate: float, depths: int, trajectories: int, **circuit: object) -> Cost:
    """Records of one ensemble after every layer."""
    fields = {"family": "hybrid-clifford", "sites": sites, "measurement_rate": rate, "layers": depths, **circuit}
    at = {"every": 1, "single_layers": True}
    observe = [{"quantity": "record-bits", "at": at, "histogram": True}, {"quantity": "entropy"}]
    sweep = Sweep.parse({"circuit": fields, "observe": observe, "stop": {"trajectories": trajectories}})
    return cost_of(sampled_source(sweep, trajectories))


@pytest.mark.parametrize("rate", [0.16, 1.0])
def test_random_outcomes_accumulate_as_in_the_exact_chain(rate: float) -> None:
    """E r = p L times the sum of exact random shares, four sites, all 2,295 stabilizer states."""
    chain = ExactChain(4, periodic=True, mixed=False, rate=rate)
    total = 0.0
    for record in series(4, rate, 4, 2000).records:
        chain.advance()
        total += chain.random
        assert record.measurements == pytest.approx(4 * rate * (record.layer or 0), rel=1e-12)
        assert abs(record.again.value - total) < z_limit("paid", 40) * record.again.statistical


@pytest.mark.parametrize("rate", [0.1, 0.5, 1.0])
def test_the_share_of_random_outcomes_after_the_first_layer(rate: float) -> None:
    """4/5 - p/15 from the all-zero state, 11/15 at p = 1: two sites after a uniform gate, one measured, then both."""
    first = series(8, rate, 2, 2000).records[0]
    assert first.random is not None
    assert abs(first.random.value - (4 / 5 - rate / 15)) < z_limit("paid", 40) * first.random.statistical


def test_a_mixed_start_gives_the_exact_numbers_of_a_purifying_chain() -> None:
    """Four sites at p = .16 from the maximally mixed state: all 19,381 isotropic subspaces, four layers."""
    expected = [0.64, 1.264162133, 1.880858092, 2.492741844]
    for record, exact_number in zip(series(4, 0.16, 4, 2000, initial_state="mixed").records, expected, strict=True):
        assert abs(record.again.value - exact_number) < z_limit("paid", 40) * record.again.statistical


def agreement_of_cliffords() -> tuple[float, float]:
    """Mean of 2^-r and of r: two sites, a gate, the first one measured, a gate, both measured; all gates enumerated."""
    agreement = bits = 0.0
    first = orbit(reduced([2, 8]), 0, 1)
    for state in first:
        after, once = measure(state, 0)
        second = orbit(after, 0, 1)
        for final in second:
            last, left = measure(final, 0)
            r = once + left + measure(last, 1)[1]
            agreement += 2.0**-r / len(first) / len(second)
            bits += r / len(first) / len(second)
    return agreement, bits


def agreement_of_haar_gates(circuits: int) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """The same with Haar-random gates: of each circuit the sum of squared probabilities, and bits of information."""
    gates = stats.unitary_group.rvs(4, size=2 * circuits, random_state=77)
    branches = gates[:circuits, :, 0].reshape(circuits, 2, 2)  # by the outcome of the first site
    second = gates[circuits:].reshape(circuits, 4, 2, 2)
    chances = abs(np.einsum("ciab,cab->cia", second, branches)) ** 2
    return (chances**2).sum(axis=(1, 2)), -(chances * np.log2(chances)).sum(axis=(1, 2))


def test_the_chance_that_two_runs_agree_is_that_of_haar_gates() -> None:
    """Both gate ensembles are 2-designs (common practice); the information of a record is at least -log2 of it."""
    agreement, bits = agreement_of_cliffords()
    squares, information = agreement_of_haar_gates(4000)
    assert abs(squares.mean() - agreement) < z_limit("paid", 40) * stats.sem(squares)
    assert information.mean() > -np.log2(agreement)
    assert bits > -np.log2(agreement)


def test_counts_of_measurements_and_gates_are_those_of_the_circuit() -> None:
    ring = Ensemble.of("hybrid-clifford", sites=8, measurement_rate=0.25, layers=6)
    assert [measurements_until(ring, n) for n in (1, 6)] == [2.0, 12.0]
    assert [gates_until(ring, n) for n in (1, 6)] == [4.0, 24.0]
    line = Ensemble.of("hybrid-clifford", sites=8, measurement_rate=0.25, boundary="open", layers=6)
    assert gates_until(line, 6) == 21.0
    ising = Ensemble.of("projective-ising", sites=8, bond_rate=0.25, boundary="open", layers=2)
    assert measurements_until(ising, 2) == pytest.approx(2 * (7 * 0.25 + 8 * 0.75), rel=1e-12)
