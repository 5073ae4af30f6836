"""Averages of the measurement-only ZZ / X chain: exact on all set partitions, published coefficients at p = 1/2.

The model is that of Entanglement transition in the projective transverse field Ising model, PRB 102, 094204 (2020),
2006.09748; at p = 1/2 its clusters are those of critical bond percolation on a square lattice.
"""

from functools import cache
from math import log, pi, sqrt

import numpy as np
import pytest
from numpy.typing import NDArray

from support.budget import chi_square_limit, z_limit
from support.partitions import Partition, PartitionChain, entropy
from sweepmill_worker.clusters.engine import ClusterChain, ClusterReadings, run_cluster_probes
from sweepmill_worker.observables.probes import Probes

# Entropy of the half chain in bits after X of steps 1 and 3, in the steady state after X and after ZZ; random outcomes
# per measurement of ZZ and of X.  From an independent enumeration of all set partitions; p = 1/2.
EXACT = {
    (2, False): (0.125, 0.142578125, 1 / 7, 4 / 7, 6 / 7, 3 / 7),
    (4, False): (0.1953125, 0.264770984650, 0.270484953672, 0.637519858215, 0.833246094934, 0.624934571200),
    (4, True): (0.33203125, 0.400490343571, 0.402727925341, 0.895908111989, 0.756999282125, 0.756999282125),
    (8, True): (0.417861938477, 0.598096717109, 0.627488178799, 1.062910811396, 0.792478817825, 0.792478817825),
}
STEADY = 60
COUNT = 60_000


def test_the_enumeration_has_the_digits_of_an_independent_one() -> None:
    for (sites, periodic), expected in EXACT.items():
        chain, found = PartitionChain(sites, periodic, 0.5), []

        def half(state: Partition, sites: int = sites) -> int:
            return entropy(state, range(sites // 2))

        for steps in (1, 2, STEADY):
            chain.advance(steps)
            found.append(chain.mean(half))
        found += [chain.mean(half, after_bonds=True), *chain.randomness]
        assert found == pytest.approx(expected, abs=1e-11)


def test_exact_outcome_randomness_approaches_its_limit_like_one_over_the_squared_size() -> None:
    gaps = []
    for sites in (4, 6, 8):
        chain = PartitionChain(sites, True, 0.5)
        chain.advance(STEADY)
        gaps.append((LIMIT - chain.randomness[0]) * sites**2)
    assert gaps == pytest.approx([0.7496, 0.7327, 0.7276], abs=5e-5)  # towards 5 sqrt(3) / 12 = .7217


def law_of(sites: int, periodic: bool, rate: float, layers: int) -> ClusterChain:
    return ClusterChain(sites, layers, periodic, int(rate * 2**32), int((1 - rate) * 2**32))


def z_of(samples: NDArray[np.floating | np.integer], expected: float, error: float = 0.0) -> float:
    own = samples.std() / len(samples) ** 0.5
    return float((samples.mean() - expected) / np.hypot(own, error))


@pytest.mark.parametrize("rate", [0.3, 0.5])
def test_the_sampler_agrees_with_the_enumeration(rate: float) -> None:
    """False-alarm probability: a fifth of the share ``ising`` for each rate."""
    z = []
    for sites, periodic in ((2, False), (4, False), (4, True), (6, True)):
        regions = [(0,), tuple(range(sites // 2)), (0, sites // 2)] if sites > 2 else [(0,)]
        law = law_of(sites, periodic, rate, 20)
        probes = Probes(sites, sets=tuple(regions), cluster_order=True)
        readings = run_cluster_probes(law, (0x15146, sites), 0, COUNT, [1, 3, 20], probes)
        chain, done = PartitionChain(sites, periodic, rate), 0
        for read, layer in enumerate((1, 3, 20)):
            chain.advance(layer - done)
            done = layer
            for number, region in enumerate(regions):
                exact = chain.mean(lambda state, r=region: entropy(state, r))  # type: ignore[misc]
                z.append(z_of(readings.entropies[:, read, number], exact))
            squares = chain.mean(lambda state: sum(state.count(cluster) for cluster in state))
            z.append(z_of(readings.entropies[:, read, -1], squares))
            bonds = sites if periodic else sites - 1
            for kind, measured in enumerate((bonds * rate, sites * (1 - rate))):
                z.append(z_of(readings.random_by_kind[:, layer - 1, kind], chain.randomness[kind] * measured))
    assert np.abs(z).max() < z_limit("ising", 5 * len(z))


LIMIT = 6 - 3 * sqrt(3)
"""Random outcomes per measurement at p = 1/2: deterministic ones close a cycle of the percolation graph, and the number
of clusters per site is (3 sqrt(3) - 5) / 2 (Proc. R. Soc. A 322, 251 (1971), from memory); a ring of L sites has
(5 sqrt(3) / 24) / L^2 more (Universal finite-size amplitude, PRL 79, 3447 (1997), from memory)."""
SLOPE = sqrt(3) / (2 * pi)
"""S(bits) of half a ring grows like SLOPE * ln L: c = 3 sqrt(3) ln 2 / (2 pi) of the projective chain, in nats c/3 ln L
(value confirmed by an independent Monte Carlo, .2753(17))."""

# Entropy of half the chain after X at p = 1/2: an independent Monte Carlo, with its standard errors.
RING = {32: (1.0408, 0.0016), 64: (1.2301, 0.0015), 128: (1.4259, 0.0031)}
LINE = {32: (0.6512, 0.0006), 64: (0.7574, 0.0009), 128: (0.8600, 0.0016), 256: (0.9618, 0.0027)}
TRAJECTORIES = {16: 10_000, 32: 6_000, 64: 2_500, 128: 900, 256: 350}
COMPARISONS = 2 * (len(RING) + len(LINE) + len(TRAJECTORIES) + 3)  # twice: half of the share


@cache
def critical(sites: int, periodic: bool) -> ClusterReadings:
    """Steps 4L .. 5L, read every L/8."""
    law = law_of(sites, periodic, 0.5, 5 * sites)
    reads = range(4 * sites, 5 * sites + 1, sites // 8)
    key = (0xC417, 2 * sites + periodic)
    probes = Probes(sites, ring=True) if periodic else Probes(sites, arcs=np.array([(0, sites // 2)]))
    return run_cluster_probes(law, key, 0, TRAJECTORIES[sites], reads, probes)


def half_entropies(sites: int, periodic: bool) -> NDArray[np.float64]:
    """Per trajectory, averaged over the steps read and, on the ring, over translations."""
    readings = critical(sites, periodic)
    if periodic:
        return np.asarray(readings.entropies[:, :, sites // 2 - 1].mean(axis=1) / sites)
    return np.asarray(readings.entropies[:, :, 0].mean(axis=1))


def test_half_chain_entropies_agree_with_an_independent_monte_carlo() -> None:
    z = [z_of(half_entropies(sites, True), *value) for sites, value in RING.items()]
    z += [z_of(half_entropies(sites, False), *value) for sites, value in LINE.items()]
    assert np.abs(z).max() < z_limit("ising", COMPARISONS)


def test_outcome_randomness_has_the_percolation_value_and_its_finite_size_term() -> None:
    for sites in TRAJECTORIES:
        readings, late = critical(sites, True), slice(4 * sites, None)
        random, measured = readings.random[:, late].sum(axis=1), readings.measured[:, late].sum(axis=1)
        expected = LIMIT - 5 * sqrt(3) / 12 / sites**2
        # the next term, from the exact values at L = 6 and 8, is below .4 / L^4: 6e-6 at L = 16
        assert abs(z_of((random - expected * measured) / measured.mean(), 0.0, 6e-6)) < z_limit("ising", COMPARISONS)


def test_the_entropy_of_half_a_ring_grows_with_the_published_logarithm() -> None:
    """S = a ln L + b + c / L fitted to five sizes; doubling differences alone still fall by a few percent."""
    sizes = np.array(list(TRAJECTORIES))
    samples = [half_entropies(int(sites), True) for sites in sizes]
    means = np.array([s.mean() for s in samples])
    errors = np.array([s.std() / len(s) ** 0.5 for s in samples])
    design = np.stack([np.log(sizes), np.ones(len(sizes)), 1 / sizes], axis=1) / errors[:, None]
    covariance = np.linalg.inv(design.T @ design)
    fit = covariance @ design.T @ (means / errors)
    assert ((design @ fit - means / errors) ** 2).sum() < chi_square_limit("ising", COMPARISONS, len(sizes) - 3)
    limit, error = z_limit("ising", COMPARISONS), sqrt(covariance[0, 0])
    assert error < 0.006
    assert abs(fit[0] - SLOPE) < limit * error
    doublings = (means[-1] - means[-3]) / log(4)  # from 64 to 256 sites, where c / L is left with 2 %
    assert abs(doublings - SLOPE) < 0.02 * SLOPE + limit * np.hypot(errors[-1], errors[-3]) / log(4)
