"""The cluster engine circuit by circuit: against plain Python, against stim, and its own promises."""

import random
from collections import Counter
from itertools import pairwise

import numpy as np
import pytest
import stim
from numpy.typing import NDArray
from scipy.sparse import coo_array
from scipy.sparse.csgraph import connected_components

from support.partitions import bonds_of, entropy, measure_x, measure_zz
from support.stim_oracle import Reference
from sweepmill_worker.clifford.engine import HybridChain
from sweepmill_worker.clusters.engine import (
    MAX_SITES,
    ClusterChain,
    describe,
    run_cluster_probes,
    run_clusters,
    working_bytes,
)
from sweepmill_worker.clusters.state import new_state
from sweepmill_worker.clusters.trajectories import new_supply
from sweepmill_worker.observables.probes import Information, Probes, of_regions

KEY = (0x715EED, 0xC1057E4)
SIZES = [(2, False), (2, True), (3, True), (4, False), (5, True), (8, True), (9, False), (16, True), (33, False)]
RATES = (0.0, 0.2, 0.5, 0.8, 1.0)


def chain(sites: int, layers: int, periodic: bool, rate: float) -> ClusterChain:
    return ClusterChain(sites, layers, periodic, int(rate * 2**32), int((1 - rate) * 2**32))


def regions_of(sites: int, seed: int) -> list[tuple[int, ...]]:
    """Cuts, arcs of the ring, arbitrary sets, nothing and everything, in no order."""
    draw = random.Random(seed)
    arcs = [tuple(sorted((f + i) % sites for i in range(draw.randint(1, sites)))) for f in range(sites)]
    sets = [tuple(sorted(draw.sample(range(sites), draw.randint(0, sites)))) for _ in range(8)]
    cuts = [tuple(range(x)) for x in range(sites + 1)]
    return draw.sample([*arcs, *sets, *cuts], len(arcs) + len(sets) + len(cuts))


@pytest.mark.parametrize("rate", RATES)
@pytest.mark.parametrize(("sites", "periodic"), SIZES)
def test_everything_read_agrees_with_a_simulation_in_plain_python(sites: int, periodic: bool, rate: float) -> None:
    law, reads = chain(sites, 12, periodic, rate), [1, 2, 5, 12]
    probes = everything(sites, seed=sites)
    readings = run_cluster_probes(law, KEY, 3, 2, reads, probes)
    for index in range(2):
        partition = tuple(range(sites))
        for number, layer in enumerate(describe(law, KEY, 3 + index), start=1):
            assert set(layer.bonds) <= set(bonds_of(sites, periodic))
            counted = [0, 0]
            for left, right in layer.bonds:
                partition, is_random = measure_zz(partition, left, right)
                counted[0] += is_random
            for site in layer.sites:
                partition, is_random = measure_x(partition, site)
                counted[1] += is_random
            assert readings.random_by_kind[index, number - 1].tolist() == counted
            assert readings.measured_by_kind[index, number - 1].tolist() == [len(layer.bonds), len(layer.sites)]
            if number in reads:
                found = readings.entropies[index, reads.index(number)]
                np.testing.assert_array_equal(found, plain(partition, probes))
    np.testing.assert_array_equal(readings.random, readings.random_by_kind.sum(axis=2))
    np.testing.assert_array_equal(readings.measured, readings.measured_by_kind.sum(axis=2))


def everything(sites: int, seed: int) -> Probes:
    """All probes that clusters answer."""
    sets = tuple(regions_of(sites, seed))
    arcs = np.array([(first, length) for first in range(sites) for length in range(sites + 1)])
    return Probes(
        sites,
        arcs=arcs[random.Random(seed).sample(range(len(arcs)), len(arcs))],
        sets=sets,
        line=True,
        ring=True,
        informations=tuple(Information(region, tuple(range(1, len(region) + 1))) for region in sets if region),
        negativities=sets[:3],
        lengths=True,
        cluster_order=True,
    )


def plain(partition: tuple[int, ...], probes: Probes) -> list[int]:
    """The integers of all probes, one entropy after the other."""
    sites = len(partition)

    def arc(first: int, length: int) -> int:
        return entropy(partition, [(first + i) % sites for i in range(length)])

    def information(site: int, region: tuple[int, ...]) -> int:
        without = [other for other in region if other != site]
        return entropy(partition, [site]) + entropy(partition, region) - entropy(partition, without)

    def rows(first: int, beyond: int) -> int:  # independent group elements inside an interval
        return max(beyond - first, 0) - entropy(partition, range(first, beyond))

    def exactly(first: int, beyond: int) -> int:  # clipped generators that begin and end there
        return rows(first, beyond) - rows(first + 1, beyond) - rows(first, beyond - 1) + rows(first + 1, beyond - 1)

    return [
        *(arc(first, length) for first, length in probes.arcs.tolist()),
        *(entropy(partition, region) for region in probes.sets),
        *(sum(arc(first, n) for first in range(sites - n + 1)) for n in range(1, sites + 1)),
        *(sum(arc(first, n) for first in range(sites)) for n in range(1, sites + 1)),
        *(information(site, item.region) for item in probes.informations for site in item.region),
        *(entropy(partition, region) for region in probes.negativities),  # pure: the entropy of either side
        *(sum(exactly(first, first + n) for first in range(sites - n + 1)) for n in range(1, sites + 1)),
        sum(n * n for n in Counter(partition).values()),
    ]


@pytest.mark.parametrize("rate", RATES)
@pytest.mark.parametrize(("sites", "periodic"), SIZES)
def test_circuits_agree_with_stim(sites: int, periodic: bool, rate: float) -> None:
    law, reads, regions = chain(sites, 10, periodic, rate), [1, 3, 10], regions_of(sites, seed=1)
    readings = run_clusters(law, KEY, 8, 1, reads, regions)
    oracle = Reference(HybridChain(sites, 0, False, False, 0))
    oracle.simulator.h(*range(sites))
    for number, layer in enumerate(describe(law, KEY, 8), start=1):
        observed = [stim.PauliString(dict.fromkeys(bond, "Z")) for bond in layer.bonds]
        observed += [stim.PauliString({site: "X"}) for site in layer.sites]
        outcomes = 0
        for pauli in observed:
            outcomes += oracle.simulator.peek_observable_expectation(pauli) == 0
            oracle.simulator.measure_observable(pauli)
        assert readings.random[0, number - 1] == outcomes
        assert readings.measured[0, number - 1] == len(observed)
        if number in reads:
            assert readings.entropies[0, reads.index(number)].tolist() == oracle.entropies(regions)


@pytest.mark.parametrize("first", [0, 2**32 - 3, 2**63])
def test_a_batch_is_the_sum_of_its_pieces(first: int) -> None:
    law, probes = chain(40, 9, True, 0.5), everything(40, seed=2)
    whole = run_cluster_probes(law, KEY, first, 7, [2, 9], probes)
    pieces = [run_cluster_probes(law, KEY, first + a, b - a, [2, 9], probes) for a, b in pairwise([0, 1, 1, 5, 7])]
    for field in ("entropies", "random", "measured", "random_by_kind", "measured_by_kind"):
        np.testing.assert_array_equal(getattr(whole, field), np.concatenate([getattr(p, field) for p in pieces]))


def test_a_longer_circuit_begins_with_the_shorter_one() -> None:
    short, long = (run_clusters(chain(20, n, False, 0.5), KEY, 0, 9, [5], [(0, 1, 2)]) for n in (5, 15))
    np.testing.assert_array_equal(short.entropies, long.entropies)
    np.testing.assert_array_equal(short.random_by_kind, long.random_by_kind[:, :5])


@pytest.mark.parametrize(("sites", "periodic"), [(4096, True), (4097, True), (10_001, False)])
def test_long_chains_whose_words_come_in_pieces_agree_with_connected_components(sites: int, periodic: bool) -> None:
    law = chain(sites, 4, periodic, 0.6)
    lengths = [sites // 2, 1, sites // 3, sites - 1]
    probes = Probes(sites, arcs=np.array([(0, x) for x in lengths]), cluster_order=True)
    readings = run_cluster_probes(law, KEY, 0, 1, [4], probes)
    labels: NDArray[np.signedinteger] = np.arange(sites)
    for layer in describe(law, KEY, 0):
        left, right = labels[np.array(layer.bonds)].T
        graph = coo_array((np.ones(len(left)), (left, right)), shape=(2 * sites, 2 * sites))
        labels = connected_components(graph, directed=False)[1][labels]
        labels[list(layer.sites)] = 2 * sites + np.arange(len(layer.sites))
        labels = np.unique(labels, return_inverse=True)[1]
    partition = tuple(labels.tolist())
    cuts = [entropy(partition, range(x)) for x in lengths]
    assert readings.entropies[0, 0].tolist() == [*cuts, (np.bincount(labels) ** 2).sum()]


def test_without_bonds_all_stay_alone_and_without_sites_all_become_one() -> None:
    probes = Probes(100, ring=True, cluster_order=True)
    alone = run_cluster_probes(chain(100, 3, True, 0.0), KEY, 0, 2, [3], probes)
    assert (alone.random == 0).all()
    assert (alone.measured == 100).all()
    assert (alone.entropies == [*[0] * 100, 100]).all()
    one = run_cluster_probes(chain(100, 3, True, 1.0), KEY, 0, 2, [3], probes)
    assert one.random[0].tolist() == [99, 0, 0]
    assert (one.entropies == [*[100] * 99, 0, 100**2]).all()


def test_the_largest_chain_runs_in_the_memory_it_states() -> None:
    law = chain(MAX_SITES, 2, True, 0.5)
    readings = run_cluster_probes(law, KEY, 0, 1, [2], Probes(MAX_SITES, ring=True))
    assert readings.measured_by_kind.sum() == pytest.approx(2 * MAX_SITES, rel=0.01)
    rings = readings.entropies[0, 0]
    assert rings[-1] == 0
    np.testing.assert_array_equal(rings[:-1], rings[-2::-1])  # pure: of an arc and its complement
    arrays: list[NDArray[np.generic]] = [*new_state(MAX_SITES, intervals=True), *new_supply(MAX_SITES)]
    held = sum(array.nbytes for array in arrays)
    assert held <= working_bytes(MAX_SITES) < 1.01 * held


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"sites": 1}, "sites: must be 2"),
        ({"sites": MAX_SITES + 1}, "sites: must be 2"),
        ({"layers": -1}, "layers: must be 0"),
        ({"bond_threshold": 2**32 + 1}, "bond_threshold: must be"),
        ({"site_threshold": -1}, "site_threshold: must be"),
    ],
)
def test_chains_out_of_range_are_refused(change: dict[str, int], message: str) -> None:
    fields = {"sites": 8, "layers": 4, "periodic": True, "bond_threshold": 2**31, "site_threshold": 2**31}
    with pytest.raises(ValueError, match=message):
        ClusterChain(**(fields | change))  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("change", "message"),
    [
        ({"key_words": (2**32, 0)}, "key_words: must be two"),
        ({"first": -1}, "first, count: trajectories"),
        ({"first": 2**64 - 1, "count": 2}, "first, count: trajectories"),
        ({"read_layers": [0]}, "read_layers: must ascend"),
        ({"read_layers": [2, 2]}, "read_layers: must ascend"),
        ({"probes": of_regions(8, [(1, 0)])}, "probes: sites must ascend"),
        ({"probes": of_regions(8, [(0, 8)])}, "probes: sites must ascend"),
        ({"probes": Probes(7)}, "probes: must be of a chain of 8 sites"),
        ({"probes": Probes(8, references=1)}, "probes: clusters have no reference qubits"),
    ],
)
def test_arguments_out_of_range_are_refused(change: dict[str, object], message: str) -> None:
    fields: dict[str, object] = {"key_words": KEY, "first": 0, "count": 1, "read_layers": [1], "probes": Probes(8)}
    with pytest.raises(ValueError, match=message):
        run_cluster_probes(chain(8, 4, True, 0.5), **(fields | change))  # type: ignore[arg-type]
