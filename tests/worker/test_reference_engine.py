"""The signed engine: its probes against the kernel's, and averages that only signs can give."""

from itertools import product

import numpy as np
import pytest

from support.all_probes import all_probes
from support.programs import form, hybrid
from sweepmill_worker.clifford.engine import HybridChain, run_probes
from sweepmill_worker.observables.probes import Pauli, Probes
from sweepmill_worker.program.compile import compile_program
from sweepmill_worker.reference.engine import play, run_reference

KEY = (0x0123ABCD, 0xDEADBEEF)


@pytest.mark.parametrize(("sites", "boundary", "state"), [(8, "periodic", "zeros"), (7, "open", "mixed")])
def test_every_probe_agrees_with_the_kernel(sites: int, boundary: str, state: str) -> None:
    program = compile_program(hybrid(sites, 10, 0.25, boundary=boundary, initial_state=state))
    chain = HybridChain(sites, 10, boundary == "periodic", state == "mixed", 2**30)
    probes, reads = all_probes(sites, seed=sites), [1, 2, 9, 10]
    expected = run_probes(chain, KEY, 5, 3, reads, probes)
    found = run_reference(program, KEY, 5, 3, reads, probes)
    np.testing.assert_array_equal(found.entropies, expected.entropies)
    np.testing.assert_array_equal(found.random, expected.random)
    np.testing.assert_array_equal(found.measured, expected.measured)


def test_linear_observables_of_the_average_state_stay_at_infinite_temperature() -> None:
    """Pauli products have random signs, so that their averages vanish; their squares do not.

    Given the n trajectories where a product is not 0, |sum| > 5 sqrt(n) fails by accident with probability below
    2 exp(-12.5) = 7e-6 (Hoeffding's inequality, Journal of the American Statistical Association 58, 13 (1963)), for
    any of the 18 sums below 2e-4.
    """
    program = compile_program(hybrid(4, 6, 0.4))
    paulis = [Pauli("Z", (0,)), Pauli("X", (3,)), Pauli("ZZ", (0, 1)), Pauli("ZZ", (0, 2)), Pauli("XYZ", (0, 1, 3))]
    paulis += [Pauli("ZZZZ", (0, 1, 2, 3))]
    found = run_reference(program, KEY, 0, 300, [1, 5, 6], Probes(4, paulis=tuple(paulis))).entropies
    nonzero, sums = np.abs(found).sum(axis=0), np.abs(found.sum(axis=0))
    assert nonzero.min() > 5
    assert nonzero[:, 0].min() > 100
    assert (sums <= 5 * np.sqrt(nonzero)).all()


def test_records_of_one_fixed_circuit_average_to_the_circuit_whose_outcomes_are_lost() -> None:
    """Five pairs of sites and all single ones, at two layers: accidents as above, below 9e-4 for the 114 sums."""

    def circuit(recorded: bool) -> list[list[dict[str, object]]]:
        lost: dict[str, object] = {} if recorded else {"recorded": False}
        return [
            [
                {"apply": "uniform-clifford", "on": f"bonds-from-{parity}", "fixed": "ensemble"},
                {"measure": "Z", "on": {"sublattice": {"every": 3}}, **lost},
                {"measure": "XX", "on": {"places": [[1, 2]]}, **lost},
            ]
            for parity in (0, 1)
        ]

    sites, count = 4, 300
    paulis = [
        Pauli(a + b, (i, j)) for i, j in ((0, 1), (1, 2), (2, 3), (0, 3), (0, 2)) for a, b in product("XYZ", repeat=2)
    ]
    paulis += [Pauli(letter, (site,)) for site in range(sites) for letter in "XYZ"]
    probes = Probes(sites, paulis=tuple(paulis))
    lost = run_reference(compile_program(form(sites, 2, circuit(False))), KEY, 0, 1, [1, 2], probes).entropies[0]
    read = run_reference(compile_program(form(sites, 2, circuit(True))), KEY, 0, count, [1, 2], probes).entropies
    assert np.abs(lost).sum() > 0
    assert np.abs(read).sum() > np.abs(lost).sum() * count
    np.testing.assert_array_equal(read[:, lost != 0], np.broadcast_to(lost[lost != 0], (count, (lost != 0).sum())))
    assert (np.abs(read.sum(axis=0))[lost == 0] <= 5 * np.sqrt(count)).all()


def test_a_record_is_half_as_probable_with_every_random_outcome() -> None:
    program = compile_program(hybrid(6, 8, 0.3))
    for k in range(5):
        random = 0
        for played in play(program, KEY, k):
            random += played.random
            assert played.trajectory.record.log2_probability == -random
        assert random > 0
        layers = [one.layer for one in played.trajectory.record.measurements]
        assert layers == sorted(layers)


def test_trajectories_do_not_depend_on_the_range_they_are_sampled_in() -> None:
    program = compile_program(hybrid(6, 5, 0.3))
    probes = Probes(6, paulis=(Pauli("Z", (2,)), Pauli("ZZ", (0, 5))), lengths=True)
    whole = run_reference(program, KEY, 0, 6, [3, 5], probes)
    part = run_reference(program, KEY, 4, 2, [3, 5], probes)
    np.testing.assert_array_equal(part.entropies, whole.entropies[4:])
    np.testing.assert_array_equal(part.random, whole.random[4:])
