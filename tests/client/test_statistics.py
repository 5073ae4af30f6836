import math

import numpy as np
import pytest
from scipy import stats

from sweepmill.accumulate import Accumulator
from sweepmill.coordinates import Coordinate
from sweepmill.statistics import needed_trajectories, rule_met, summarize

ONE = (Coordinate(None, None, 1),)


def accumulate(values: object) -> Accumulator:
    return Accumulator.from_values(np.asarray(values, dtype=np.int64).reshape(-1, 1), 0)


def test_mean_variance_and_standard_error_agree_with_scipy() -> None:
    values = np.random.default_rng(1).integers(-20, 50, size=500)
    (moments,) = summarize(accumulate(values), (Coordinate(3, None, 8),))
    described = stats.describe(values / 8)
    assert moments.mean == pytest.approx(described.mean, rel=1e-14)
    assert moments.variance == pytest.approx(described.variance, rel=1e-13)
    assert moments.standard_error == pytest.approx(stats.sem(values / 8), rel=1e-13)
    assert (moments.minimum, moments.maximum) == described.minmax


def test_the_error_of_a_ratio_agrees_with_the_jackknife() -> None:
    # An Introduction to the Bootstrap (1993), chapter 11: the jackknife of a smooth function of means agrees with its
    # linearization to relative order 1/N
    generator = np.random.default_rng(2)
    bottom = generator.integers(20, 40, size=400)
    top = generator.binomial(bottom, 0.9)
    pairs = np.stack([top, bottom], axis=1)[:, None, :]
    (moments,) = summarize(Accumulator.from_values(pairs, 0), ONE)
    without = (top.sum() - top) / (bottom.sum() - bottom)
    jackknife = math.sqrt(399 / 400 * ((without - without.mean()) ** 2).sum())
    assert moments.mean == top.sum() / bottom.sum()
    assert moments.standard_error == pytest.approx(jackknife, rel=0.01)


def test_the_error_of_a_sample_that_hardly_varies_is_a_bound_and_never_zero() -> None:
    (constant,) = summarize(accumulate([4] * 100), ONE)
    assert constant.bound
    assert constant.variance == 0
    assert constant.standard_error == pytest.approx(1 / 100)
    (hardly,) = summarize(accumulate([4] * 100 + [5] * 29), ONE)
    assert hardly.bound
    assert hardly.standard_error > stats.sem([4] * 100 + [5] * 29)
    (varied,) = summarize(accumulate([4] * 100 + [5] * 30), ONE)
    assert not varied.bound
    assert varied.standard_error == pytest.approx(stats.sem([4] * 100 + [5] * 30))


def test_the_bound_counts_one_unit_of_the_quantity_not_of_its_sum() -> None:
    (moments,) = summarize(accumulate([0] * 100), (Coordinate(None, None, 64),))
    assert moments.standard_error == pytest.approx(1 / 100)


def test_one_trajectory_has_a_mean_and_no_error() -> None:
    (moments,) = summarize(accumulate([3]), ONE)
    assert moments.mean == 3
    assert math.isnan(moments.standard_error)
    assert not rule_met(accumulate([3]), ONE, 1e9)


def test_a_ratio_without_measurements_is_undefined_and_meets_no_rule() -> None:
    nothing = Accumulator.from_values(np.zeros((50, 1, 2), dtype=np.int64), 0)
    (moments,) = summarize(nothing, ONE)
    assert math.isnan(moments.mean)
    assert not rule_met(nothing, ONE, 1e9)


def test_a_rule_needs_every_coordinate() -> None:
    values = np.stack([np.arange(100) % 2, np.arange(100) % 50], axis=1)
    total = Accumulator.from_values(values, 0)
    places = (Coordinate(1, None, 1), Coordinate(2, None, 1))
    errors = [moments.standard_error for moments in summarize(total, places)]
    assert errors[0] < 0.1 < errors[1]
    assert not rule_met(total, places, 0.1)
    assert rule_met(total, places, 2.0)


def test_the_predicted_number_of_trajectories_follows_the_error() -> None:
    varied = accumulate(np.arange(100) % 2)
    (moments,) = summarize(varied, ONE)
    needed = needed_trajectories(varied, ONE, moments.standard_error / 2)
    assert needed == pytest.approx(400, abs=1)
    assert needed_trajectories(accumulate([1] * 100), ONE, 0.001) == pytest.approx(1000, abs=1)


def test_variances_of_huge_sums_lose_nothing() -> None:
    offset = 2**61
    shifted, plain = accumulate([offset, offset + 2, offset + 4]), accumulate([0, 2, 4])
    assert summarize(shifted, ONE)[0].variance == summarize(plain, ONE)[0].variance
