"""Clusters against the stabilizer engine: the same circuits written as data, word by word."""

import numpy as np
import pytest

from support.budget import z_limit
from support.partitions import PartitionChain, entropy
from support.programs import form
from support.sampled import deviations, executed, intervals, sampled
from sweepmill.ensemble import Ensemble
from sweepmill_worker.clusters.engine import run_clusters
from sweepmill_worker.clusters.ensembles import cluster_chain


@pytest.mark.parametrize("bond_rate", [0.0, 0.3, 0.5, 0.123456789012, 1.0])
@pytest.mark.parametrize(("sites", "boundary"), [(2, "open"), (2, "periodic"), (7, "periodic"), (16, "open")])
def test_both_engines_give_the_same_trajectories(sites: int, boundary: str, bond_rate: float) -> None:
    ensemble = Ensemble.of("projective-ising", sites=sites, boundary=boundary, bond_rate=bond_rate, layers=20)
    reads, regions = [1, 2, 3, 20], [*intervals(sites), (0, sites - 1)][-60:]
    stabilizers = sampled(ensemble, 25, reads, regions)
    clusters = run_clusters(cluster_chain(ensemble), ensemble.key_words, 0, 25, reads, regions)
    np.testing.assert_array_equal(clusters.entropies, stabilizers.entropies)
    np.testing.assert_array_equal(clusters.random, stabilizers.random)
    np.testing.assert_array_equal(clusters.measured, stabilizers.measured)


def test_rates_are_the_decimal_numbers_that_are_written() -> None:
    chain = cluster_chain(Ensemble.of("projective-ising", sites=4, bond_rate=0.1, layers=1))
    assert chain.bond_threshold == 2**32 // 10
    assert chain.site_threshold == 9 * 2**32 // 10
    sure = cluster_chain(Ensemble.of("projective-ising", sites=4, bond_rate=1.0, layers=1))
    assert (sure.bond_threshold, sure.site_threshold) == (2**32, 0)


def test_the_state_between_bonds_and_sites_has_its_exact_averages() -> None:
    """False-alarm probability: the share ``ising``, a tenth of it."""
    bonds = {"measure": "ZZ", "on": "bonds", "rate": 0.5}
    fields = {"measure": "X", "on": "sites", "rate": 0.5}
    z = []
    for sites, boundary in ((4, "open"), (4, "periodic"), (6, "periodic")):
        circuit = form(sites, 30, [[bonds], [fields]], boundary=boundary, initial_state="plus")
        if boundary == "periodic":
            del circuit["boundary"]
        found = executed(circuit, (0x2215, sites), 40_000, [29, 30], [tuple(range(sites // 2)), (0, sites // 2)])
        chain = PartitionChain(sites, boundary == "periodic", 0.5)
        chain.advance(15)
        regions = (range(sites // 2), (0, sites // 2))
        exact = [
            [chain.mean(lambda state, r=r: entropy(state, r), after_bonds=between) for r in regions]  # type: ignore[misc]
            for between in (True, False)
        ]
        z.append(deviations(found.entropies, np.array(exact)))
        number = sites if boundary == "periodic" else sites - 1
        random = np.array([chain.randomness[0] * number / 2, chain.randomness[1] * sites / 2])
        z.append(deviations(found.random[:, [28, 29]], random))
    everything = np.concatenate(z)
    assert np.abs(everything).max() < z_limit("ising", 10 * len(everything))
