"""Square lattices and long-range pairs where they coincide with laws that are known exactly.

Statistical tests share the budget ``square-and-long-range``.
"""

from collections import defaultdict
from collections.abc import Sequence

import numpy as np
import pytest

from support.budget import chi_square_limit, z_limit
from support.random_states import stabilizer_law
from support.sampled import deviations, sampled
from support.stabilizer_enumeration import ExactChain, Group, entropy, measurement_law, orbit
from sweepmill.ensemble import Ensemble

COUNT = 60_000
REGIONS = [(0,), (0, 1), (0, 2), (0, 3), (1, 2, 3)]
Matching = Sequence[tuple[int, int]]


def square(width: int, height: int, layers: int, rate: float, **more: str) -> Ensemble:
    return Ensemble.of(
        "hybrid-clifford-square", width=width, height=height, layers=layers, measurement_rate=rate, **more
    )


def long_range(sites: int, exponent: float, layers: int, rate: float, **more: str) -> Ensemble:
    return Ensemble.of(
        "hybrid-clifford-long-range", sites=sites, exponent=exponent, layers=layers, measurement_rate=rate, **more
    )


class Mixture:
    """The law of four sites when a layer is one of several matchings of gates, then measurements at a rate."""

    def __init__(self, rate: float) -> None:
        self.rate = rate
        self.law = ExactChain(4, periodic=True, mixed=False, rate=rate).law

    def advance(self, matchings: Sequence[tuple[float, Matching]]) -> float:
        """One layer; the mean number of random outcomes."""
        gated: dict[Group, float] = defaultdict(float)
        for chance, matching in matchings:
            for group, weight in self._gates(matching).items():
                gated[group] += chance * weight
        measured: dict[Group, float] = defaultdict(float)
        random = 0.0
        for group, weight in gated.items():
            for after, chance, outcomes, _ in measurement_law(group, 4, self.rate):
                measured[after] += weight * chance
                random += weight * chance * outcomes
        self.law = dict(measured)
        return random

    def _gates(self, matching: Matching) -> dict[Group, float]:
        law = self.law
        for left, right in matching:
            together: dict[tuple[Group, ...], float] = defaultdict(float)
            for group, weight in law.items():
                together[orbit(group, left, right)] += weight
            law = {image: weight / len(images) for images, weight in together.items() for image in images}
        return law

    def means(self) -> list[float]:
        return [sum(entropy(g, 4, region) * weight for g, weight in self.law.items()) for region in REGIONS]


def test_a_square_of_two_by_two_is_a_ring_of_four_measured_twice() -> None:
    """Its bonds, in turn: both rows, none, both columns, none; without gates in between, two rounds of measurements
    at rate p are one at 1 - (1 - p)^2, so even layers are those of the ring 0, 1, 3, 2."""
    rate, reads = 0.08, [2, 4, 6, 8]
    found = sampled(square(2, 2, 8, rate, boundary="open"), COUNT, reads, REGIONS)
    chain, exact, random = Mixture(1 - (1 - rate) ** 2), [], []
    for number in range(4):
        matching = [(0, 1), (2, 3)] if number % 2 == 0 else [(0, 2), (1, 3)]
        random.append(chain.advance([(1.0, matching)]))
        exact.append(chain.means())
    z = deviations(found.entropies, np.array(exact))
    assert np.abs(z).max() < z_limit("square-and-long-range", SHARED * len(z))
    # measuring a site again is no new outcome: both rounds have as many random ones as one round of the union
    z = deviations(found.random.reshape(COUNT, 4, 2).sum(axis=2), np.array(random))
    assert np.abs(z).max() < z_limit("square-and-long-range", SHARED * len(z))


SHARED = 8
"""Parts of the share: two for 2 x 2, one for each exponent, one for all at p = 1, one for all at p = 0."""
PAIRINGS = [[(0, 1), (2, 3)], [(1, 2), (3, 0)], [(0, 2), (1, 3)]]


@pytest.mark.parametrize("exponent", [0.0, 1.5, 60.0])
def test_long_range_pairs_of_four_sites_are_an_exact_mixture_of_three_matchings(exponent: float) -> None:
    """A ring of four: a partner at distance 1 has weight 1, at distance 2 weight 2^-exponent.  At exponent 60 only
    neighbors pair, at 0 all pairs are alike."""
    far = 2**-exponent / (2 + 2**-exponent)
    chances = [(1 - far) / 2, (1 - far) / 2, far]
    reads = [1, 2, 4]
    found = sampled(long_range(4, exponent, 4, 0.16), COUNT, reads, REGIONS)
    chain, exact, random = Mixture(0.16), [], []
    for layer in range(1, 5):
        random.append(chain.advance(list(zip(chances, PAIRINGS, strict=True))))
        if layer in reads:
            exact.append(chain.means())
    z = np.concatenate([deviations(found.entropies, np.array(exact)), deviations(found.random, np.array(random))])
    assert np.abs(z).max() < z_limit("square-and-long-range", SHARED * len(z))


@pytest.mark.parametrize(
    "ensemble",
    [square(4, 4, 8, 1.0), square(2, 6, 8, 1.0), long_range(10, 0.0, 8, 1.0), long_range(10, 2.0, 8, 1.0)],
    ids=["4 x 4", "2 x 6", "all to all", "exponent 2"],
)
def test_measuring_every_site_leaves_products_and_eleven_of_fifteen_outcomes_random(ensemble: Ensemble) -> None:
    """Every gate makes one of the 15 stabilizer states of two sites; of its two outcomes 22/15 are random in the mean:
    two for 8 states, one for 6 (counting)."""
    regions = [(0,), tuple(range(ensemble.sites // 2)), (0, 3, 5)]
    found = sampled(ensemble, 4000, [1, 4, 8], regions)
    assert (found.entropies == 0).all()
    assert (found.measured == ensemble.sites).all()
    per_trajectory = found.random.sum(axis=1) / (8 * ensemble.sites)
    (z,) = deviations(per_trajectory[:, None], np.array([11 / 15]))
    assert abs(z) < z_limit("square-and-long-range", SHARED * 4)


@pytest.mark.parametrize(
    ("ensemble", "region"),
    [
        (square(3, 2, 160, 0.0, boundary="open"), (0, 2, 4)),
        (square(4, 2, 160, 0.0), (0, 1, 2, 3)),
        (long_range(6, 0.0, 80, 0.0), (0, 1, 2)),
    ],
    ids=["3 x 2", "4 x 2", "all to all"],
)
def test_deep_unitary_circuits_make_uniformly_random_stabilizer_states(
    ensemble: Ensemble, region: tuple[int, ...]
) -> None:
    entropies = sampled(ensemble, 10_000, [ensemble.layers], [region]).entropies[:, 0, 0]
    counts = np.bincount(entropies, minlength=len(region) + 1)
    expected = 10_000 * stabilizer_law(len(region), ensemble.sites - len(region))
    frequent = expected > 5
    chi_square = ((counts - expected) ** 2 / expected)[frequent].sum()
    assert chi_square < chi_square_limit("square-and-long-range", SHARED * 3, int(frequent.sum()))
