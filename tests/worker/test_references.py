"""Reference qubits: what of them survives, and that as many as sites are the mixed chain's purifier, per circuit."""

import numpy as np
import pytest

from support.budget import z_limit
from support.sampled import deviations, executed, intervals, sampled
from sweepmill.ensemble import Ensemble
from sweepmill.presets import layered_form


def hybrid(sites: int, layers: int, rate: float, **more: int | str) -> Ensemble:
    return Ensemble.of("hybrid-clifford", sites=sites, layers=layers, measurement_rate=rate, **more)


def references_of(sites: int, count: int) -> tuple[int, ...]:
    return tuple(range(sites, sites + count))


@pytest.mark.parametrize(("sites", "count", "scrambling"), [(6, 1, 0), (6, 1, 7), (8, 3, 4), (8, 8, 2)])
def test_without_measurements_references_keep_all_their_entropy(sites: int, count: int, scrambling: int) -> None:
    ensemble = hybrid(sites, 9, 0.0, references=count, scrambling_layers=scrambling)
    regions = [references_of(sites, count), tuple(range(sites)), tuple(range(sites + count))]
    entropies = sampled(ensemble, 50, [1, 4, 9], regions).entropies
    assert (entropies == [count, count, 0]).all()


def test_references_only_lose_entropy_and_the_chain_has_it_as_long() -> None:
    ensemble = hybrid(8, 40, 0.2, references=4, scrambling_layers=8)
    regions = [references_of(8, 4), tuple(range(8))]
    entropies = sampled(ensemble, 2000, range(1, 41), regions).entropies
    of_references = entropies[:, :, 0]
    np.testing.assert_array_equal(of_references, entropies[:, :, 1])
    assert (np.diff(of_references, axis=1) <= 0).all()
    means = of_references.mean(axis=0)
    assert (np.diff(means) <= 0).all()
    assert means[0] > 3
    assert means[-1] < 1


def test_measuring_every_site_once_purifies_the_references() -> None:
    entropies = sampled(hybrid(6, 2, 1.0, references=3), 100, [1, 2], [references_of(6, 3)]).entropies
    assert (entropies == 0).all()


@pytest.mark.parametrize(
    ("sites", "boundary", "rate"), [(4, "periodic", 0.16), (7, "open", 0.3), (12, "periodic", 0.1)]
)
def test_a_mixed_chain_is_one_with_a_reference_for_every_site_circuit_by_circuit(
    sites: int, boundary: str, rate: float
) -> None:
    common = {"boundary": boundary}
    mixed = hybrid(sites, 30, rate, initial_state="mixed", **common)
    pure = hybrid(sites, 30, rate, references=sites, **common)
    reads, regions = [1, 2, 3, 10, 30], [*intervals(sites), (0, sites - 1), (0, 2)]
    one = sampled(mixed, 100, reads, regions)
    other = executed(layered_form(pure), mixed.key_words, 100, reads, regions)
    np.testing.assert_array_equal(one.entropies, other.entropies)
    np.testing.assert_array_equal(one.random, other.random)
    np.testing.assert_array_equal(one.measured, other.measured)
    purifier = executed(layered_form(pure), mixed.key_words, 100, reads, [references_of(sites, sites)])
    whole = regions.index(tuple(range(sites)))
    np.testing.assert_array_equal(purifier.entropies[:, :, 0], one.entropies[:, :, whole])


def test_references_purify_by_the_exact_averages_of_the_mixed_chain() -> None:
    """Two sites, open, p = .1: entropy after layers 1 .. 6, from all isotropic subspaces (re-derived in
    ``test_exact_chains``). False-alarm probability: the share ``references``."""
    exact = np.array([1.8, 1.62, 1.4635404, 1.321674084, 1.197799989552, 1.084737574898])
    ensemble = hybrid(2, 6, 0.1, boundary="open", references=2)
    found = sampled(ensemble, 100_000, range(1, 7), [(2, 3)]).entropies[:, :, 0]
    z = deviations(found, exact)
    assert np.abs(z).max() < z_limit("references", len(z))
