"""Points of one ensemble are correlated: whitening, its limits, honest errors and p-values on estimated covariances.

Fixed seeds; a right program fails a check with probability below 1e-6 (5 standard errors).
"""

import numpy as np
import pytest
from scipy import stats

from sweepmill.analysis import Points, fit_laws
from sweepmill.analysis.law_fit import FittedLaw
from sweepmill.analysis.laws import AREA, VOLUME_LOG

KEY = "c" * 64


def correlated(count: int, folds: int, generator: np.random.Generator) -> tuple[Points, np.ndarray]:
    """S = 0.3 l + 0.7 ln l - 1 with strongly correlated noise, as cuts of the same trajectories have."""
    lengths = np.geomspace(4, 64, count)
    exact = 0.3 * lengths + 0.7 * np.log(lengths) - 1
    covariance = 0.04 * np.minimum.outer(lengths, lengths) / 64 + 0.002 * np.eye(count)
    values = exact + generator.multivariate_normal(np.zeros(count), covariance, size=folds)
    replicas = (values.sum(axis=0) - values) / (folds - 1)
    error = values.std(axis=0, ddof=1) / np.sqrt(folds)
    return Points.of(64, lengths, values.mean(axis=0), error, replicas, [KEY] * count), exact


def fits(count: int, folds: int, replicates: int, seed: int) -> list[FittedLaw]:
    generator = np.random.default_rng(seed)
    return [FittedLaw.of(correlated(count, folds, generator)[0], VOLUME_LOG) for _ in range(replicates)]


@pytest.mark.parametrize(("count", "kind"), [(8, "folds"), (24, "diagonal")])
def test_p_values_are_uniform_whitened_or_not(count: int, kind: str) -> None:
    # Kolmogorov-Smirnov at 1e-6 where the law is exact (Hotelling); the scaled chi^2 of diagonal weights is an
    # approximation, so only its mean is looked at: 5 standard errors of it, and as much for the approximation
    found = fits(count, 32, 150, seed=50)
    p_values = np.array([one.goodness.p_value for one in found])
    assert {one.solution.problem.whitening.kind for one in found} == {kind}
    if kind == "folds":
        assert stats.kstest(p_values, "uniform").pvalue > 1e-6
    assert p_values.mean() == pytest.approx(0.5, abs=(5 if kind == "folds" else 10) * np.sqrt(1 / 12 / 150))


@pytest.mark.parametrize("count", [8, 24])
def test_quoted_errors_cover_whitened_or_not(count: int) -> None:
    # pulls with standard deviation 1: 5 standard errors of it, 1/sqrt(2 x 150), and 10 %
    # because 32 folds know an error to 13 % only, which widens the law of the pulls
    found = fits(count, 32, 150, seed=51)
    pulls = np.array([(one.values[:3] - (0.3, 0.7, -1)) / np.sqrt(one.variances[:3]) for one in found])
    assert pulls.std(axis=0) == pytest.approx(np.ones(3), abs=0.1 + 5 / np.sqrt(300))


def test_too_many_points_for_the_folds_are_weighted_one_by_one_and_the_result_says_so() -> None:
    comparison = fit_laws(correlated(24, 32, np.random.default_rng(52))[0])
    assert "weights are diagonal" in comparison.notes[0]
    assert comparison["volume + logarithm"].fitted.goodness.kind == "scaled chi2"


def test_thinned_points_are_whitened() -> None:
    comparison = fit_laws(correlated(24, 32, np.random.default_rng(52))[0].thinned(10))
    assert not comparison.notes
    assert comparison["volume + logarithm"].fitted.goodness.kind == "Hotelling T2"


def test_points_of_one_ensemble_without_folds_are_noted() -> None:
    points = correlated(8, 32, np.random.default_rng(53))[0]
    comparison = fit_laws(Points.of(64, points.x, points.mean, points.error, keys=[KEY] * 8))
    assert "no folds were given" in comparison.notes[0]


def test_points_that_depend_on_each_other_linearly_are_refused() -> None:
    replicas = np.repeat(np.random.default_rng(54).standard_normal((32, 1)), 3, axis=1)
    points = Points.of(8, [1, 2, 3], [1.0, 1.0, 1.0], 0.1, replicas, [KEY] * 3)
    with pytest.raises(ValueError, match="linearly dependent"):
        FittedLaw.of(points, AREA)
