"""Circuit by circuit: the kernel against stim, an independent simulator with signs and destabilizers."""

import random

import numpy as np
import pytest

from support.stim_oracle import Reference
from sweepmill_worker.clifford.engine import HybridChain, describe, run

KEY = (0x0123ABCD, 0xDEADBEEF)
RATES = (0.0, 0.05, 0.16, 0.4, 1.0)
CHAINS = [
    (sites, periodic, mixed)
    for sites in (2, 3, 4, 5, 8, 12, 16, 33)
    for periodic in (False, True)
    for mixed in (False, True)
    if not (periodic and sites % 2)
]


def regions_of(sites: int, seed: int) -> list[tuple[int, ...]]:
    """Nothing, everything, cuts from either side (all in small chains), arcs of the ring, arbitrary sets."""
    draw = random.Random(seed)
    step = 1 if sites < 64 else sites // 9
    cuts = [tuple(range(x)) for x in [*range(0, sites, step), sites]]
    cuts += [tuple(range(x, sites)) for x in range(1, sites, step)]
    intervals = [
        tuple(sorted((first + i) % sites for i in range(draw.randint(1, sites))))
        for first in (draw.randrange(sites) for _ in range(6))
    ]
    sets = [tuple(sorted(draw.sample(range(sites), draw.randint(1, sites)))) for _ in range(6)]
    return cuts + intervals + sets


def compare(chain: HybridChain, k: int, reads: list[int]) -> None:
    """Entropies at the read layers, random outcomes and measurements at every layer."""
    regions = regions_of(chain.sites, k)
    readings = run(chain, KEY, k, 1, reads, regions)
    reference = Reference(chain)
    for number, layer in enumerate(describe(chain, KEY, k), start=1):
        assert readings.random[0, number - 1] == reference.apply(layer)
        assert readings.measured[0, number - 1] == len(layer.measured)
        if number in reads:
            expected = reference.entropies(regions)
            np.testing.assert_array_equal(readings.entropies[0, reads.index(number)], expected)


@pytest.mark.parametrize("rate", RATES)
@pytest.mark.parametrize(("sites", "periodic", "mixed"), CHAINS)
def test_small_circuits_agree_with_stim(sites: int, periodic: bool, mixed: bool, rate: float) -> None:
    chain = HybridChain(sites, 12, periodic, mixed, int(rate * 2**32))
    for k in range(3):
        compare(chain, k, [1, 2, 3, 7, 12])


@pytest.mark.parametrize("mixed", [False, True])
@pytest.mark.parametrize(
    ("sites", "periodic", "rate"),
    [(64, True, 0.1), (64, False, 0.3), (65, False, 0.1), (100, True, 0.16), (130, True, 0.1), (130, False, 0.05)],
)
def test_circuits_of_several_words_agree_with_stim(sites: int, periodic: bool, mixed: bool, rate: float) -> None:
    compare(HybridChain(sites, 40, periodic, mixed, int(rate * 2**32)), 11, [1, 20, 39, 40])


def test_a_deep_mixed_chain_purifies_like_stim() -> None:
    compare(HybridChain(8, 120, True, True, int(0.3 * 2**32)), 5, [1, 10, 60, 120])


@pytest.mark.parametrize(("sites", "mixed", "layers"), [(300, True, 20), (514, False, 40), (1030, False, 6)])
def test_circuits_of_several_chunks_agree_with_stim(sites: int, mixed: bool, layers: int) -> None:
    compare(HybridChain(sites, layers, True, mixed, int(0.2 * 2**32)), 2, [layers])
