"""Circuit by circuit: the executor of circuits written as data against the signed simulation, for every family."""

import numpy as np
import pytest

from support.all_probes import all_probes
from support.families import LARGE, SMALL, label, regions_of
from support.random_programs import random_ensemble
from support.signed import entropies
from sweepmill.ensemble import Ensemble
from sweepmill.presets import layered_form
from sweepmill_worker.program.compile import compile_program
from sweepmill_worker.program.run import run_probes, run_program
from sweepmill_worker.reference.engine import play, run_reference


def compare(ensemble: Ensemble, k: int, reads: list[int]) -> None:
    """Entropies at the layers read, outcome counts of every layer."""
    program = compile_program(layered_form(ensemble))
    regions = regions_of(program.sites, program.total, k)
    readings = run_program(program, ensemble.key_words, k, 1, reads, regions)
    for number, trajectory, random, measured in play(program, ensemble.key_words, k):
        if number <= 0:
            continue
        where = f"layer {number} of {ensemble.normal_form()}, trajectory {k}"
        counts = readings.random[0, number - 1], readings.measured[0, number - 1]
        assert counts == (random, measured), where
        if number in reads:
            found = readings.entropies[0, reads.index(number)]
            expected = entropies(trajectory.state.stabilizers(), program.total, regions)
            np.testing.assert_array_equal(found, expected, where)


@pytest.mark.parametrize("ensemble", SMALL, ids=label)
def test_small_circuits_of_every_family_agree_with_stim(ensemble: Ensemble) -> None:
    for k in range(3):
        compare(ensemble, k, [1, 2, 3, 5, 8, 9])


@pytest.mark.parametrize("ensemble", [one for one in SMALL if 4 <= one.sites <= 8], ids=label)
def test_every_probe_of_every_family_agrees_with_stim(ensemble: Ensemble) -> None:
    """Negativities, lengths of generators and all else that depends on no sign, reference qubits included."""
    program = compile_program(layered_form(ensemble))
    probes = all_probes(program.sites, program.references, seed=3)
    expected = run_reference(program, ensemble.key_words, 6, 2, [1, 4, 9], probes)
    found = run_probes(program, ensemble.key_words, 6, 2, [1, 4, 9], probes)
    np.testing.assert_array_equal(found.entropies, expected.entropies)
    np.testing.assert_array_equal(found.random, expected.random)
    np.testing.assert_array_equal(found.measured, expected.measured)


@pytest.mark.parametrize("ensemble", LARGE, ids=label)
def test_large_circuits_of_every_family_agree_with_stim(ensemble: Ensemble) -> None:
    compare(ensemble, 2**33 + 1, [1, ensemble.layers - 1, ensemble.layers])


@pytest.mark.parametrize("block", range(20))
def test_random_circuits_written_as_data_agree_with_stim(block: int) -> None:
    for seed in range(10 * block, 10 * block + 10):
        ensemble = random_ensemble(seed, 2 + seed % 9, 3 + seed % 5)
        for k in range(2):
            compare(ensemble, k, list(range(1, ensemble.layers + 1)))


@pytest.mark.parametrize(("seed", "sites"), [(1001, 40), (1002, 66), (1003, 90), (1004, 34)])
def test_large_circuits_written_as_data_agree_with_stim(seed: int, sites: int) -> None:
    ensemble = random_ensemble(seed, sites, 8)
    compare(ensemble, seed, [1, 3, ensemble.layers])


def test_gates_across_the_end_of_a_ring_with_references_are_followed_by_products() -> None:
    """Products choose their pivot by the extent of rows, which such a gate lengthens without going around."""
    form = {
        "family": "layered",
        "revision": 1,
        "sites": 4,
        "initial_state": "mixed",
        "layers": 1,
        "before": [[{"swap_in": "reference", "on": {"places": [[3]]}}]],
        "repeat": [[{"apply": "cx", "on": {"places": [[3, 0]]}}]],
        "after": [[{"measure": "YY", "on": {"places": [[0, 1]]}}, {"measure": "YY", "on": {"places": [[3, 0]]}}]],
    }
    compare(Ensemble.from_normal_form(form), 0, [1, 2])


@pytest.mark.parametrize("on", [{"places": []}, {"blocks": {"width": 2, "from": 3}}])
def test_a_step_without_places_does_nothing(on: dict[str, object]) -> None:
    form = {
        "family": "layered",
        "revision": 1,
        "sites": 4,
        "boundary": "open",
        "layers": 2,
        "repeat": [
            [{"apply": "uniform-clifford", "on": "sites"}, {"apply": "cx", "on": on}, {"measure": "ZZ", "on": on}]
        ],
    }
    compare(Ensemble.from_normal_form(form), 0, [1, 2])
