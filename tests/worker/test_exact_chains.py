"""Small chains against exact averages over all stabilizer groups.

The digits come from an independent derivation (Markov chain on all Lagrangian or isotropic subspaces); they are
re-derived here by `support.stabilizer_enumeration`, and the sampler is compared with the enumeration.
"""

from collections.abc import Callable, Sequence
from functools import cache

import numpy as np
import pytest
from numpy.typing import NDArray

from support.budget import z_limit
from support.stabilizer_enumeration import ExactChain, Group, entropy
from sweepmill_worker.clifford.engine import HybridChain, run

HALF = (0, 1)
SIGNS = {(0,): 1, (1,): 1, (2,): 1, (0, 1, 2): 1, (0, 1): -1, (1, 2): -1, (0, 2): -1}
"""Regions of the tripartite information of four sites."""
TRAJECTORIES = 100_000


@cache
def chain_at(sites: int, periodic: bool, mixed: bool, rate: float, layer: int) -> ExactChain:
    chain = ExactChain(sites, periodic, mixed, rate)
    if layer > 1:
        before = chain_at(sites, periodic, mixed, rate, layer - 1)
        chain.law, chain.layer = dict(before.law), before.layer
    chain.advance()
    return chain


def tripartite(group: Group) -> float:
    return sum(sign * entropy(group, 4, region) for region, sign in SIGNS.items())


# p, layer: E[S_A], Var[S_A], E[2^-S_A], E[S_site], E[I3], random outcomes per measurement
PERIODIC = {
    (0.0, 2): (1.0768, 0.42290176, 0.5248, 0.688, -0.2016, None),
    (0.0, 4): (1.20076736, 0.371110707159, 0.47613952, 0.8096512, -0.33288192, None),
    (0.10, 2): (0.842709589776, 0.435321496372, 0.616491625024, 0.532124577792, -0.096475673376, 0.871670580373),
    (0.16, 1): (0, 0, 1, 0.28224, 0, 0.789333333333),
    (0.16, 2): (0.718846198397, 0.420668976022, 0.667897230123, 0.448813479794, -0.059900305136, 0.857572115871),
    (0.16, 4): (0.771706987861, 0.417241027025, 0.644279720354, 0.505176403063, -0.084238567658, 0.880618515075),
    (1.0, 3): (0, 0, 1, 0, 0, 11 / 15),
    # steady states, as far as the chain has converged
    (0.0, 30): (62 / 51, 0.365244136870, 8 / 17, 14 / 17, -6 / 17, None),
    (0.16, 30): (0.775804647909, 0.416817421174, 0.642458379168, 0.509522430392, -0.086255622641, 0.882394080108),
    (0.16, 31): (0.572736048393, 0.365635263698, 0.728747700358, 0.509522430392, -0.086255622641, 0.882394080108),
}


@pytest.mark.parametrize(("rate", "layer"), PERIODIC)
def test_the_enumeration_has_the_digits_of_the_periodic_chain(rate: float, layer: int) -> None:
    mean, variance, purity, single, i3, randomness = PERIODIC[rate, layer]
    chain = chain_at(4, True, False, rate, layer)
    assert chain.moments(lambda g: entropy(g, 4, HALF)) == pytest.approx((mean, variance), abs=2e-9)
    assert chain.moments(lambda g: 2.0 ** -entropy(g, 4, HALF))[0] == pytest.approx(purity, abs=2e-9)
    assert chain.mean((0,)) == pytest.approx(single, abs=2e-9)
    assert chain.moments(tripartite)[0] == pytest.approx(i3, abs=2e-9)
    if randomness is not None:
        assert chain.randomness() == pytest.approx(randomness, abs=2e-9)


def test_the_enumeration_has_the_digits_of_the_open_chain() -> None:
    expected = {2: 0.467816669504, 4: 0.576098122140, 30: 0.604523928664, 31: 0.449156995199}
    for layer, mean in expected.items():
        assert chain_at(4, False, False, 0.16, layer).mean(HALF) == pytest.approx(mean, abs=2e-9)
    assert chain_at(4, False, False, 0.16, 30).randomness() == pytest.approx(0.791475948289, abs=2e-9)
    assert chain_at(4, False, False, 0.16, 31).randomness() == pytest.approx(0.863903968479, abs=2e-9)


PURIFICATION_2 = (1.8, 1.62, 1.4635404, 1.321674084, 1.197799989552, 1.084737574898)
PURIFICATION_4 = (3.36, 2.836850688, 2.427202310176, 2.101621828649, 1.836954815440, 1.617385045065)
CUMULATIVE_4 = (0.64, 1.264162133, 1.880858092, 2.492741844)


def test_the_enumeration_has_the_digits_of_purification() -> None:
    for layer, expected in enumerate(PURIFICATION_2, start=1):
        assert chain_at(2, False, True, 0.1, layer).mean((0, 1)) == pytest.approx(expected, abs=1e-11)
    random = 0.0
    for layer in (1, 2):  # the third layer has 19,381 states
        chain = chain_at(4, True, True, 0.16, layer)
        random += chain.random
        assert chain.mean((0, 1, 2, 3)) == pytest.approx(PURIFICATION_4[layer - 1], abs=1e-11)
        assert random == pytest.approx(CUMULATIVE_4[layer - 1], abs=1e-8)


def deviations(
    chain: tuple[int, bool, bool, float], layers: Sequence[int], regions: Sequence[tuple[int, ...]]
) -> NDArray[np.float64]:
    """z of E[S], E[S^2], E[2^-S] of every region and layer, and of the random outcomes of each layer."""
    sites, periodic, mixed, rate = chain
    law = HybridChain(sites, max(layers), periodic, mixed, int(rate * 2**32))
    readings = run(law, (0xE4AC7, sites + 10 * periodic), 0, TRAJECTORIES, layers, regions)
    z = []
    for read, layer in enumerate(layers):
        exact = chain_at(*chain, layer)
        for number, region in enumerate(regions):
            samples = readings.entropies[:, read, number]
            for function in FUNCTIONS:
                moments = exact.moments(lambda g, r=region, f=function: float(f(entropy(g, sites, r))))  # type: ignore[misc]
                z.append(deviation(function(samples), *moments))
        random = readings.random[:, layer - 1]
        z.append((random.mean() - exact.random) / max(random.std() / TRAJECTORIES**0.5, 1e-12))
    return np.array(z)


FUNCTIONS: tuple[Callable[..., NDArray[np.float64]], ...] = (
    lambda s: s * 1.0,
    lambda s: s * s * 1.0,
    lambda s: 2.0**-s,
)


def deviation(samples: NDArray[np.float64], mean: float, variance: float) -> float:
    """z of a sample mean; exactly zero is demanded of what cannot vary."""
    if variance < 1e-12:
        assert samples.min() == samples.max() == pytest.approx(mean, abs=1e-9)
        return 0.0
    return float((samples.mean() - mean) / (variance / len(samples)) ** 0.5)


SAMPLED: list[tuple[tuple[int, bool, bool, float], tuple[int, ...], list[tuple[int, ...]]]] = [
    ((2, False, False, 0.16), (1, 2, 5), [(0,)]),
    ((4, True, False, 0.0), (2, 4), [(0, 1), (0,), (0, 2), (1, 2)]),
    ((4, True, False, 0.1), (2,), [(0, 1), (0,), (0, 2), (1, 2)]),
    ((4, True, False, 0.16), (1, 2, 4, 30, 31), [(0, 1), (0,), (0, 2), (1, 2)]),
    ((4, False, False, 0.16), (2, 4, 30, 31), [(0, 1), (0,), (0, 2), (1, 2)]),
]


def test_the_sampler_agrees_with_the_enumeration() -> None:
    z = np.concatenate([deviations(*case) for case in SAMPLED])
    assert np.abs(z).max() < z_limit("exact-chains", len(z))


def test_the_sampler_purifies_as_the_enumeration_does() -> None:
    z = [deviations((2, False, True, 0.1), (1, 2, 3, 6), [(0,), (0, 1)])]
    z += [deviations((4, True, True, 0.16), (1, 2), [(0,), (0, 1), (0, 2), (0, 3), (0, 1, 2, 3)])]
    law = HybridChain(4, 6, True, True, int(0.16 * 2**32))
    readings = run(law, (4, 4), 0, TRAJECTORIES, range(1, 7), [(0, 1, 2, 3)])
    totals = [(readings.entropies[:, layer, 0], PURIFICATION_4[layer]) for layer in range(6)]
    totals += [(readings.random[:, : layer + 1].sum(axis=1), CUMULATIVE_4[layer]) for layer in range(4)]
    for samples, expected in totals:
        z.append(np.array([(samples.mean() - expected) / (samples.std() / TRAJECTORIES**0.5)]))
    everything = np.concatenate(z)
    assert np.abs(everything).max() < z_limit("purification", len(everything))


def test_the_tripartite_information_of_single_trajectories_averages_to_the_exact_one() -> None:
    law = HybridChain(4, 4, True, False, int(0.16 * 2**32))
    readings = run(law, (7, 7), 0, TRAJECTORIES, [4], list(SIGNS))
    i3 = readings.entropies[:, 0, :] @ np.array(list(SIGNS.values()))
    mean, variance = chain_at(4, True, False, 0.16, 4).moments(tripartite)
    assert abs(deviation(i3, mean, variance)) < z_limit("tripartite", 1)
