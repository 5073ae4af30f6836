"""The chain with a depolarized edge: exact average purities, their logarithms, and the sampler against them.

For stabilizer states the purity is 2^-S.  Digits from an independent derivation, checked there by brute force.
"""

from math import log2, pi, sqrt

import numpy as np
import pytest
from numpy.typing import NDArray

from support.budget import z_limit
from support.programs import form
from support.purity import emitted, purities, scaled_bath_purities, scaled_bulk_purities
from support.sampled import deviations, executed, intervals, sampled
from sweepmill.ensemble import Ensemble

# Six sites, bath after every layer: layers: purity of the whole chain, of sites 0 .. 2, of sites 1 .. 5.
EVERY_LAYER = {
    1: (0.4, 0.32, 0.8),
    3: (0.208, 0.164096, 0.416),
    5: (0.11584, 0.1372540928, 0.23168),
    10: (0.043734016, 0.1276264017, 0.087468032),
}
WHOLE = [0.4, 0.208, 0.11584, 0.066688, 0.03916288, 0.02330841088]
"""Semi-infinite chain after 1, 3, 5, ... layers, and after one more."""


def test_the_recursion_with_a_bath_has_the_derived_digits() -> None:
    for layers, (whole, left, right) in EVERY_LAYER.items():
        f = purities(6, layers, bath=1)
        assert (f[0, 6], f[0, 3], f[1, 6]) == pytest.approx((whole, left, right), abs=1e-11)
    assert purities(16, 20, bath=1)[0, 16] == pytest.approx(3.159029654330e-3, abs=1e-14)
    assert purities(8, 20, bath=1)[0, 8] == pytest.approx(6.066834860671e-3, abs=1e-14)
    assert purities(6, 400, bath=1)[0, 6] == pytest.approx(2**-6)


def test_a_bath_after_every_layer_or_every_other_one_agree_after_even_layers() -> None:
    for layers in (2, 4, 6, 8, 20):
        np.testing.assert_allclose(purities(7, layers, bath=1), purities(7, layers, bath=2), rtol=1e-12)


def test_a_chain_longer_than_the_light_cone_is_semi_infinite() -> None:
    for number, purity in enumerate(WHOLE):
        layers = 2 * number + 1
        for extra in (0, 1):
            chain = purities(layers + extra + 1, layers + extra, bath=1)
            assert chain[0, -1] == pytest.approx(purity, abs=1e-12)
    found = scaled_bath_purities(12) * 0.8 ** np.arange(1, 13)
    assert found == pytest.approx(np.repeat(WHOLE, 2), abs=1e-12)


def test_windows_of_what_the_bath_takes_have_the_derived_digits() -> None:
    expected = {
        (1, 1): 0.4,
        (1, 4): 0.208,
        (3, 6): 0.114304,
        (5, 8): 0.1031489536,
        (9, 12): 0.100289657070,
        (1, 12): 0.02413416448,
    }
    for (first, last), purity in expected.items():
        assert emitted(8, first, last) == pytest.approx(purity, abs=1e-12)
    assert emitted(8, 1, 12) == pytest.approx(purities(8, 12, bath=1)[0, 8])  # all that is not the chain
    assert emitted(14, 131, 138) == pytest.approx(0.02272, abs=1e-12)
    bulk = [0.25, 0.1, 0.046, 0.02272, 0.011728, 0.006241024]
    assert scaled_bulk_purities(12) * 0.8 ** np.arange(1, 13) == pytest.approx(np.repeat(bulk, 2), abs=1e-12)


def log_coefficient(entropies: NDArray[np.floating], layers: NDArray[np.int64]) -> tuple[float, float]:
    """Slope and coefficient of log2 t in a fit of S = a t + b log2 t + c."""
    design = np.stack([layers, np.log2(layers), np.ones(len(layers))], axis=1)
    slope, coefficient, _ = np.linalg.lstsq(design, entropies, rcond=None)[0]
    return float(slope), float(coefficient)


def test_the_entropy_of_the_chain_has_half_a_logarithm() -> None:
    """-log2 E[purity] = log2(5/4) t + (1/2) log2 t - log2(5/3 sqrt(2/pi)) of the walk of the wall, even t."""
    scaled = scaled_bath_purities(20_000)
    layers = np.arange(10_000, 20_001, 2)
    slope, coefficient = log_coefficient(log2(1.25) * layers - np.log2(scaled[layers - 1]), layers)
    assert slope == pytest.approx(0.321928094887, abs=1e-7)
    assert coefficient == pytest.approx(0.5, abs=3e-4)
    amplitudes = [scaled[t - 1] * sqrt(t) for t in (400, 1600, 20_000)]
    assert amplitudes == pytest.approx([1.323175, 1.328129, 1.329673], abs=1e-6)
    assert amplitudes[-1] == pytest.approx(5 / 3 * sqrt(2 / pi), rel=2e-4)


def test_the_entropy_of_bulk_windows_has_three_halves_of_a_logarithm() -> None:
    """-log2 E[purity] = log2(5/4) w + (3/2) log2 w - log2(250/27 sqrt(2/pi)), even w."""
    scaled = scaled_bulk_purities(8000)
    widths = np.arange(4000, 8001, 2)
    slope, coefficient = log_coefficient(log2(1.25) * widths - np.log2(scaled[widths - 1]), widths)
    assert slope == pytest.approx(0.321928094887, abs=1e-6)
    assert coefficient == pytest.approx(1.5, abs=5e-3)
    amplitudes = [scaled[w - 1] * w**1.5 for w in (400, 1600)]
    assert amplitudes == pytest.approx([7.158628, 7.328787], abs=1e-6)
    assert scaled[7999] * 8000**1.5 == pytest.approx(250 / 27 * sqrt(2 / pi), rel=3e-3)


def exact_purities(sites: int, layers: int, bath: int) -> NDArray[np.float64]:
    f = purities(sites, layers, bath)
    return np.array([f[region[0], region[-1] + 1] for region in intervals(sites)])


def test_sampled_purities_follow_the_recursion_with_a_bath() -> None:
    """False-alarm probability: the share ``edge-bath``. All intervals; 2^-S is well sampled while S is small."""
    z = []
    for sites, reads in ((3, [1, 2, 3, 8]), (4, [1, 3, 4, 5]), (6, [1, 3, 5, 10])):
        ensemble = Ensemble.of("edge-bath", sites=sites, layers=max(reads))
        found = 2.0 ** -sampled(ensemble, 40_000, reads, intervals(sites)).entropies
        z.append(deviations(found, np.array([exact_purities(sites, layers, bath=1) for layers in reads])))
    bricks = [{"apply": "uniform-clifford", "on": f"bonds-from-{parity}"} for parity in (0, 1)]
    circuit = form(5, 5, [[bricks[0]], [bricks[1], {"depolarise": True, "on": {"places": [[0]]}}]], boundary="open")
    found = 2.0 ** -executed(circuit, (0xBA7, 2), 40_000, [2, 3, 4, 5], intervals(5)).entropies
    z.append(deviations(found, np.array([exact_purities(5, layers, bath=2) for layers in (2, 3, 4, 5)])))
    everything = np.concatenate(z)
    assert np.abs(everything).max() < z_limit("edge-bath", len(everything))


def test_an_even_layer_adds_no_entropy_and_the_chain_ends_maximally_mixed() -> None:
    whole = [tuple(range(5))]
    ensemble = Ensemble.of("edge-bath", sites=5, layers=400)
    entropies = sampled(ensemble, 200, [*range(1, 21), 400], whole).entropies[:, :, 0]
    np.testing.assert_array_equal(entropies[:, 1:20:2], entropies[:, :20:2])
    assert (np.diff(entropies, axis=1) >= 0).all()  # the bath is unital: no circuit loses entropy of the whole chain
    assert (entropies[:, -1] == 5).all()
