"""Bond percolation on self-dual rectangles: crossing probability 1/2 at p = 1/2 for every size, nu = 4/3."""

import numpy as np
import pytest

from support.rectangles import crossing_counts, crossing_probability, thresholds
from sweepmill.analysis import Points, fit_collapse, fit_crossings, fit_model_free

SIZES, RATES, SAMPLES, FOLDS = (8, 16, 32), np.linspace(0.44, 0.56, 7), 128, 32


def test_configurations_are_counted_rightly() -> None:
    # counts and values from an independent enumeration
    assert crossing_counts(2) == (0, 0, 2, 8, 5, 1)
    assert crossing_counts(3) == (0, 0, 0, 3, 38, 209, 627, 1089, 1078, 677, 283, 78, 13, 1)
    assert crossing_probability(2, 0.4) == pytest.approx(0.340480, abs=1e-12)
    assert crossing_probability(3, 0.45) == pytest.approx(0.390343506107, abs=1e-12)


def test_exact_curves_cross_at_one_half_with_the_slopes_of_the_counts() -> None:
    # slopes at 1/2: 1, 1.625, 2.217285156 for n = 1, 2, 3, from the same enumeration
    rates = np.linspace(0.4, 0.6, 15)
    means = np.concatenate([rates, *([crossing_probability(n, p) for p in rates] for n in (2, 3))])
    points = Points.of(np.repeat([1, 2, 3], 15), np.tile(rates, 3), means, 1e-10)
    table = fit_crossings(points, degree=13).table
    assert [one.place for one in table] == pytest.approx([0.5, 0.5], abs=1e-9)
    assert [one.nu for one in table] == pytest.approx(
        [np.log(2) / np.log(1.625), np.log(1.5) / np.log(2.217285156 / 1.625)], abs=1e-6
    )


@pytest.fixture(scope="module")
def sampled() -> Points:
    """Crossing probabilities by Monte Carlo, every point from samples of its own, with jackknife replicas."""
    generator = np.random.default_rng(20)
    crossed = np.stack([thresholds(n, SAMPLES, generator) < p for n in SIZES for p in RATES], axis=1)
    folds = crossed.reshape(FOLDS, -1, crossed.shape[1]).mean(axis=1)
    mean = folds.mean(axis=0)
    error = np.sqrt(mean * (1 - mean) / (SAMPLES - 1))
    keys = [f"{place:064d}" for place in range(crossed.shape[1])]
    replicas = (folds.sum(axis=0) - folds) / (FOLDS - 1)
    return Points.of(np.repeat(SIZES, len(RATES)), np.tile(RATES, len(SIZES)), mean, error, replicas, keys)


def test_a_collapse_finds_the_transition_and_its_exponent(sampled: Points) -> None:
    # 6 standard errors: with 32 folds their tails are those of Student's law, chance 1e-6 per comparison
    result = fit_collapse(sampled, acceptable=1e-6)
    assert not result.flags
    assert "jackknife over 32 folds" in str(result)
    assert result.to_dict()["ensembles"] == sampled.ensembles
    for name, exact in (("p_c", 0.5), ("nu", 4 / 3), ("y_star", 0.5)):
        assert abs(result[name].sigmas_from(exact)) < 6


def test_jackknife_and_propagated_errors_agree(sampled: Points) -> None:
    # the jackknife over 32 folds has a relative error of 1/sqrt(62) = 0.13; 5 of them
    plain = Points.of(sampled.sizes, sampled.x, sampled.mean, sampled.error)
    with_folds, without = (fit_collapse(points, drift=False) for points in (sampled, plain))
    assert np.sqrt(with_folds.fitted.variances) == pytest.approx(np.sqrt(without.fitted.variances), rel=0.65)


def test_the_model_free_collapse_finds_it_too(sampled: Points) -> None:
    # chance as above
    result = fit_model_free(sampled)
    assert abs(result["p_c"].sigmas_from(0.5)) < 6
    assert abs(result["nu"].sigmas_from(4 / 3)) < 6
