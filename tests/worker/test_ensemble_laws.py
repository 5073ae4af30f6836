"""Averages over many trajectories against exact laws and an independent Monte Carlo."""

import numpy as np
import pytest
from numpy.typing import NDArray

from support.budget import chi_square_limit, z_limit
from support.purity import purities
from support.random_states import stabilizer_law
from sweepmill_worker.clifford.engine import HybridChain, run


def test_the_purity_recursion_has_the_derived_digits() -> None:
    assert purities(4, 3)[0, 1:4] == pytest.approx([0.656, 0.64, 0.656])
    assert purities(4, 8)[0, 1:4] == pytest.approx([0.5951744, 0.47613952, 0.5951744])
    assert purities(6, 4)[0, 3] == pytest.approx(0.512)
    expected = [0.509769128149, 0.269962067339, 0.165136040198, 0.132108832159]
    assert purities(8, 16)[0, 1:5] == pytest.approx(expected, abs=1e-12)
    assert purities(16, 9)[0, 8] == pytest.approx(0.16777216)
    assert purities(16, 20)[0, 8] == pytest.approx(0.016950013793, abs=1e-12)
    assert purities(8, 400)[0, 4] == pytest.approx(32 / 257)


def test_mean_purities_follow_the_recursion() -> None:
    z = []
    for sites, layers in ((4, 1), (4, 3), (4, 8), (5, 7), (6, 4), (8, 8), (16, 8)):
        law = HybridChain(sites, layers, periodic=False, mixed=False, threshold=0)
        intervals = [tuple(range(a, b)) for a in range(sites) for b in range(a + 1, sites + 1)]
        regions = intervals if sites < 16 else [tuple(range(x)) for x in (2, 4, 8, 12)]
        purity = 2.0 ** -run(law, (0x9A317, sites), 0, 50_000, [layers], regions).entropies[:, 0, :]
        exact = np.array([purities(sites, layers)[r[0], r[-1] + 1] for r in regions])
        varies = purity.std(axis=0) > 0
        assert purity[:, ~varies].mean(axis=0) == pytest.approx(exact[~varies])
        z.append((purity.mean(axis=0) - exact)[varies] / (purity.std(axis=0)[varies] / len(purity) ** 0.5))
    everything = np.concatenate(z)
    assert np.abs(everything).max() < z_limit("purity-recursion", len(everything))


def test_the_law_of_random_stabilizer_states_has_its_known_moments() -> None:
    assert stabilizer_law(2, 2) @ np.arange(3) == pytest.approx(62 / 51)
    assert stabilizer_law(3, 3) @ np.arange(4) == pytest.approx(2.166515837091, abs=1e-10)
    assert stabilizer_law(1, 3) @ np.arange(2) == pytest.approx(14 / 17)
    assert stabilizer_law(8, 8) @ np.arange(9) == pytest.approx(7.149836550088, abs=1e-11)


@pytest.mark.parametrize(
    ("sites", "periodic", "region"), [(6, True, (0, 1, 2)), (8, True, (0, 2, 4, 6)), (7, False, (1, 4))]
)
def test_deep_unitary_circuits_make_uniformly_random_stabilizer_states(
    sites: int, periodic: bool, region: tuple[int, ...]
) -> None:
    law = HybridChain(sites, 20 * sites, periodic, mixed=False, threshold=0)
    entropies = run(law, (0x9A6E, sites), 0, 20_000, [20 * sites], [region]).entropies[:, 0, 0]
    counts = np.bincount(entropies, minlength=len(region) + 1)
    expected = 20_000 * stabilizer_law(len(region), sites - len(region))
    frequent = expected > 5
    chi_square = ((counts - expected) ** 2 / expected)[frequent].sum()
    assert chi_square < chi_square_limit("page-law", 3, int(frequent.sum()))


# S_half and its standard error, I3 and its own: means over translations and both layers of a unit cell in the steady
# state of the periodic chain; an independent Monte Carlo with another code (tableaus), errors in the last digits.
MONTE_CARLO = {
    (8, 0.15): (1.4522, 0.0019, -0.2743, 0.0011),
    (16, 0.15): (2.4850, 0.0026, -0.4587, 0.0016),
    (32, 0.15): (3.7264, 0.0032, -0.5960, 0.0019),
    (8, 0.16): (1.3738, 0.0018, -0.2395, 0.0011),
    (16, 0.16): (2.2887, 0.0025, -0.3697, 0.0014),
    (32, 0.16): (3.2990, 0.0031, -0.4188, 0.0016),
    (8, 0.17): (1.2991, 0.0018, -0.2099, 0.0010),
    (16, 0.17): (2.1064, 0.0024, -0.2958, 0.0012),
    (32, 0.17): (2.9150, 0.0030, -0.2855, 0.0013),
}
# Random outcomes per measurement; and S_half of the periodic chain at p = .5 and of open chains at p = .16.
RANDOMNESS = {(8, 0.16): (0.92340, 0.00024), (16, 0.16): (0.93587, 0.00013), (32, 0.16): (0.938695, 0.000068)}
RANDOMNESS_STRONG, ENTROPY_STRONG = (0.79629, 0.00012), (0.188, 0.001)
OPEN = {16: (1.3334, 0.0022), 32: (1.8082, 0.0026)}
COMPARISONS = 2 * len(MONTE_CARLO) + len(RANDOMNESS) + 2 + len(OPEN)
TRAJECTORIES = {8: 60_000, 16: 30_000, 32: 12_000}


def translations(sites: int, pattern: tuple[int, ...]) -> list[tuple[int, ...]]:
    return [tuple(sorted((site + shift) % sites for site in pattern)) for shift in range(sites)]


def z_of(samples: NDArray[np.float64], expected: float, error: float) -> float:
    own = samples.std() / len(samples) ** 0.5
    return abs(float(samples.mean()) - expected) / float(np.hypot(own, error))


def ratio_z(random: NDArray[np.int32], measured: NDArray[np.int32], expected: float, error: float) -> float:
    """z of sum(random) / sum(measured), whose error is that of the residuals."""
    r, m = random.sum(axis=1), measured.sum(axis=1)
    return z_of((r - expected * m) / m.mean(), 0.0, error)


@pytest.mark.parametrize(("sites", "rate"), MONTE_CARLO)
def test_the_steady_state_agrees_with_an_independent_monte_carlo(sites: int, rate: float) -> None:
    quarter = sites // 4
    patterns = [
        tuple(range(quarter)),
        tuple(range(2 * quarter)),
        (*range(quarter), *range(2 * quarter, 3 * quarter)),
    ]
    law = HybridChain(sites, 4 * sites + 2, True, False, int(rate * 2**32))
    regions = [region for pattern in patterns for region in translations(sites, pattern)]
    readings = run(law, (0x3C, sites), 0, TRAJECTORIES[sites], [4 * sites + 1, 4 * sites + 2], regions)
    single, half, pair = readings.entropies.reshape(-1, 2, 3, sites).mean(axis=(1, 3)).T
    s, s_error, i3, i3_error = MONTE_CARLO[sites, rate]
    limit = z_limit("monte-carlo", COMPARISONS)
    assert z_of(half, s, s_error) < limit
    # S_A + S_B + S_C + S_ABC - S_AB - S_BC - S_AC of a pure state, averaged over translations
    assert z_of(4 * single - 2 * half - pair, i3, i3_error) < limit
    if (sites, rate) in RANDOMNESS:
        late = slice(4 * sites, None)
        assert ratio_z(readings.random[:, late], readings.measured[:, late], *RANDOMNESS[sites, rate]) < limit


def test_strong_measurement_agrees_with_an_independent_monte_carlo() -> None:
    law = HybridChain(32, 42, True, False, 2**31)
    readings = run(law, (0x3D, 0), 0, 20_000, [41, 42], translations(32, tuple(range(16))))
    limit = z_limit("monte-carlo", COMPARISONS)
    assert z_of(readings.entropies.mean(axis=(1, 2)), *ENTROPY_STRONG) < limit
    assert ratio_z(readings.random[:, 20:], readings.measured[:, 20:], *RANDOMNESS_STRONG) < limit


@pytest.mark.parametrize("sites", OPEN)
def test_open_chains_agree_with_an_independent_monte_carlo(sites: int) -> None:
    law = HybridChain(sites, 4 * sites + 2, False, False, int(0.16 * 2**32))
    readings = run(law, (0x3E, 0), 0, 20_000, [4 * sites + 1, 4 * sites + 2], [tuple(range(sites // 2))])
    assert z_of(readings.entropies.mean(axis=(1, 2)), *OPEN[sites]) < z_limit("monte-carlo", COMPARISONS)
