"""The search inside every fit, against scipy's general one where the models coincide."""

import numpy as np
import pytest
from numpy.polynomial import Polynomial as Power
from scipy.interpolate import CubicSpline
from scipy.optimize import curve_fit

from support.strip import CRITICAL, strips
from sweepmill.analysis import NaturalSpline, Points, Polynomial, fit_collapse
from sweepmill.analysis.law_fit import FittedLaw
from sweepmill.analysis.laws import FRACTIONAL, LOGARITHM, POWER_DECAY, VOLUME_POWER

X = np.geomspace(2, 200, 14)


def noisy(mean: np.ndarray, error: np.ndarray, seed: int) -> Points:
    return Points.of(200, X, mean + error * np.random.default_rng(seed).standard_normal(len(X)), error)


def test_a_power_law_has_the_values_and_covariance_of_curve_fit() -> None:
    points = noisy(3 * X**-1.25, 0.02 * X**-1.25, 1)
    fitted = FittedLaw.of(points, POWER_DECAY)
    start, sigma = (1.0, 1.0), points.error
    best, covariance = curve_fit(lambda x, a, k: a * x**-k, X, points.mean, start, sigma, absolute_sigma=True)
    np.testing.assert_allclose(fitted.values, best, rtol=1e-6)
    np.testing.assert_allclose(np.sqrt(fitted.variances), np.sqrt(np.diag(covariance)), rtol=1e-4)


def test_a_volume_law_with_a_power_has_the_values_and_covariance_of_curve_fit() -> None:
    points = noisy(0.3 * X + 2 * X**0.35 - 1, np.full(14, 0.02), 2)
    fitted = FittedLaw.of(points, VOLUME_POWER)
    best, covariance = curve_fit(
        lambda x, s, c, b, g: s * x + c * x**g + b, X, points.mean, (0.3, 1, 0, 0.4), points.error, absolute_sigma=True
    )
    np.testing.assert_allclose(fitted.values, best, rtol=1e-4)
    np.testing.assert_allclose(np.sqrt(fitted.variances), np.sqrt(np.diag(covariance)), rtol=1e-3)


def test_a_logarithm_has_the_values_of_a_weighted_straight_line() -> None:
    points = noisy(0.7 * np.log(X) + 1, np.linspace(0.01, 0.05, 14), 3)
    best, covariance = np.polyfit(np.log(X), points.mean, 1, w=1 / points.error, cov="unscaled")
    fitted = FittedLaw.of(points, LOGARITHM)
    np.testing.assert_allclose(fitted.values[:2], best, rtol=1e-9)
    np.testing.assert_allclose(np.sqrt(fitted.variances[:2]), np.sqrt(np.diag(covariance)), rtol=1e-9)
    assert fitted.values[2] == pytest.approx(best[0] * np.log(2))


def test_a_collapse_has_the_values_and_covariance_of_curve_fit() -> None:
    points = strips((32, 64, 128), 0.15, 1e-3, seed=3)

    def model(places: np.ndarray, k: float, nu: float, *coefficients: float) -> np.ndarray:
        sizes, x = places
        return np.asarray(Power(coefficients)((x - k) * sizes ** (1 / nu)))

    start = (CRITICAL, 1.0, 0.8, -2.0, 0.0, 0.0)
    best, covariance = curve_fit(
        model, (points.sizes, points.x), points.mean, start, points.error, absolute_sigma=True, xtol=1e-12
    )
    fitted = fit_collapse(points, drift=False).fitted
    np.testing.assert_allclose(fitted.values, best[:3], rtol=1e-6)
    np.testing.assert_allclose(np.sqrt(fitted.variances), np.sqrt(np.diag(covariance))[:3], rtol=1e-3)


def test_a_refit_to_slightly_other_data_finds_what_a_fresh_search_finds() -> None:
    first = noisy(2 * X**0.4 + 1, np.full(14, 0.02), 4)
    other = noisy(2 * X**0.4 + 1, np.full(14, 0.02), 5)
    again = FittedLaw.of(first, FRACTIONAL).solution.refit(other.mean)
    fresh = FittedLaw.of(other, FRACTIONAL)
    assert again[0][0] == pytest.approx(fresh.solution.theta[0], abs=1e-2 * float(np.sqrt(fresh.variances[2])))


def test_the_spline_is_the_natural_cubic_spline_of_scipy() -> None:
    knots, values = np.linspace(-1, 1, 6), np.random.default_rng(6).standard_normal(6)
    v = np.linspace(-1, 1, 41)
    expected = CubicSpline(knots, values, bc_type="natural")(v)
    np.testing.assert_allclose(NaturalSpline(6).basis(v) @ values, expected, atol=1e-12)


def test_the_spline_goes_on_as_a_straight_line() -> None:
    beyond = NaturalSpline(5).basis(np.array([1.0, 1.2, 1.4]))
    np.testing.assert_allclose(beyond[2] - beyond[1], beyond[1] - beyond[0], atol=1e-12)


def test_the_polynomials_are_those_of_legendre() -> None:
    v = np.linspace(-1, 1, 9)
    np.testing.assert_allclose(Polynomial(5).basis(v), np.polynomial.legendre.legvander(v, 5), atol=1e-14)
