"""The hybrid Clifford transition on a table of an independent simulation, not of this program.

Periodic chains, averaged over both layer parities and all offsets. An independent fit of a denser table of the same
simulation gave p_c = 0.1598(2), nu = 1.24(3), I3 = -0.42 for L = 32, 64, 128.
"""

import numpy as np
import pytest

from sweepmill.analysis import Points, Polynomial, Scaling, fit_central_charge, fit_collapse, fit_crossings, fit_laws

RATES = (0.150, 0.160, 0.170)
I3 = {  # size: means and standard errors of the tripartite information (bits) at the three rates
    16: ((-0.4587, -0.3697, -0.2958), (0.0016, 0.0014, 0.0012)),
    32: ((-0.5960, -0.4188, -0.2855), (0.0019, 0.0016, 0.0013)),
    64: ((-0.7665, -0.4162, -0.2111), (0.0036, 0.0027, 0.0018)),
    128: ((-1.1188, -0.4123, -0.1206), (0.0077, 0.0029, 0.0024)),
}
SIZES = np.array([8, 16, 32, 64, 128])
HALF = ((1.3738, 2.2887, 3.2990, 4.3232, 5.3864), (0.0018, 0.0025, 0.0031, 0.0060, 0.0074))  # at p = 0.16
RANDOM = ((0.92340, 0.93587, 0.938695, 0.939432, 0.939725), (0.00024, 0.00013, 0.000068, 0.000056, 0.000032))


def tripartite(*sizes: int) -> Points:
    means, errors = (np.concatenate([I3[size][part] for size in sizes]) for part in (0, 1))
    return Points.of(np.repeat(sizes, 3), np.tile(RATES, len(sizes)), means, errors)


def test_large_sizes_give_the_known_critical_point() -> None:
    result = fit_collapse(tripartite(32, 64, 128))
    assert not result.flags
    assert abs(result["p_c"].sigmas_from(0.1598, 0.0002)) < 3
    assert abs(result["nu"].sigmas_from(1.24, 0.03)) < 3
    assert abs(result["y_star"].value + 0.42) < 0.01


def test_crossings_of_large_sizes_agree() -> None:
    table = fit_crossings(tripartite(32, 64, 128), degree=2).table
    assert all(abs(one.place - 0.1598) < 3 * np.hypot(one.place_error, 0.0002) for one in table)


def test_with_a_small_size_the_fit_is_flagged_and_withholds_its_error_bar() -> None:
    # corrections to scaling at L = 16: an independent fit had chi2/dof = 3002/27
    result = fit_collapse(tripartite(16, 32, 64, 128), Scaling(Polynomial(4)))
    assert result.goodness.ratio > 20
    assert "does not describe the data" in result.flags[0]
    assert result["p_c"].error is None


def test_corrections_to_scaling_that_are_left_out_are_flagged_and_those_that_are_fitted_are_not() -> None:
    # synthetic, at the precision of 10^5 trajectories: y = f(u) + 0.6 L^-1; chance of failure
    # below 5e-6: p-values of 1e-6, 5 standard errors
    rates, sizes = np.linspace(0.14, 0.18, 9), np.array([16.0, 32.0, 64.0, 128.0])
    x, n = np.tile(rates, 4), np.repeat(sizes, 9)
    u = (x - 0.16) * n ** (1 / 1.3)
    noise = 2e-3 * np.random.default_rng(30).standard_normal(36)
    points = Points.of(n, x, -0.42 + 0.5 * u - 0.2 * u**2 + 0.02 * u**3 + 0.6 / n + noise, 2e-3)
    plain = fit_collapse(points, drift=False)
    assert plain.flags
    assert abs(plain["p_c"].value - 0.16) > 1e-4
    corrected = fit_collapse(points, Scaling(corrected=True, omega=1.0), acceptable=1e-6, drift=False)
    assert not corrected.flags
    assert abs(corrected["p_c"].sigmas_from(0.16)) < 5
    assert abs(corrected["nu"].sigmas_from(1.3)) < 5
    free = fit_collapse(points, Scaling(corrected=True, omega=None), acceptable=1e-6, drift=False)
    assert abs(free["omega"].sigmas_from(1.0)) < 5


def test_slopes_by_the_logarithm_of_the_size_drift_as_they_are_known_to() -> None:
    # slopes L -> 2L of the same simulation: 1.457(6), 1.478(10), 1.534(14) for L = 16, 32, 64
    result = fit_laws(Points.of(SIZES, SIZES, *HALF))
    slopes = {(one.low, one.high): one for one in result.slopes}
    for low, slope, error in ((16, 1.457, 0.006), (32, 1.478, 0.010), (64, 1.534, 0.014)):
        found = slopes[low, 2 * low]
        assert found.slope == pytest.approx(slope, abs=1e-3)
        assert found.error == pytest.approx(error, abs=5e-4)
    assert result["logarithm"].faults  # a pure logarithm from L = 8 on does not describe the data


def test_the_logarithm_of_the_large_sizes_has_the_published_coefficient() -> None:
    # about 1.6 (Measurement-driven entanglement transition in hybrid quantum circuits, Phys. Rev. B 100, 134306 (2019))
    large = Points.of(SIZES[1:], SIZES[1:], HALF[0][1:], HALF[1][1:])
    law = fit_laws(large)["logarithm"]
    assert abs(law.fitted.values[0] - 1.6) < 0.2


def test_the_record_free_energy_gives_the_known_product_of_central_charge_and_anisotropy() -> None:
    # 0.22(1), with f = 0.93975(5) at infinite size, from independent data for L = 6 to 32
    result = fit_central_charge(Points.of(SIZES, SIZES, *RANDOM), rate=0.16)
    assert not result.flags
    assert abs(result.c_eff.sigmas_from(0.22, 0.01)) < 3
    assert abs(result.outcome_randomness.sigmas_from(0.93975, 0.00005)) < 3
    assert {row.what for row in result.drift} >= {"x >= 16", "x >= 32", "f + B L^-2 + D L^-4"}
    assert "free energy of the record" in str(result)


def test_the_finite_size_correction_of_projective_ising_chains_is_that_of_percolation() -> None:
    # exact chains, f(L) with (6 - 3 sqrt 3 - f) L^2 = 0.7496, 0.7327, 0.7276 for L = 4, 6, 8; limit 5 sqrt 3/12
    # (universal cluster numbers, Phys. Rev. Lett. 79, 3447 (1997), from memory)
    sizes = np.array([4.0, 6.0, 8.0])
    exact = 6 - 3 * np.sqrt(3) - np.array([0.7496, 0.7327, 0.7276]) / sizes**2
    result = fit_central_charge(Points.of(sizes, sizes, exact, 3e-4), rate=1.0)
    assert not result.flags
    assert result.fitted.values[0] == np.float64(result.outcome_randomness.value)
    assert abs(result.outcome_randomness.value - (6 - 3 * np.sqrt(3))) < 1e-3
    assert abs(-result.fitted.values[1] - 5 * np.sqrt(3) / 12) < 0.05
