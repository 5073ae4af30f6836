"""Averages from exact histograms."""

import numpy as np
import pytest
from scipy import stats

from sweepmill.analysis import purity


def test_the_mean_purity_is_that_of_the_trajectories_themselves() -> None:
    entropies = np.random.default_rng(95).binomial(6, 0.4, size=640)
    occurrences = np.zeros((7, 64))
    np.add.at(occurrences, (entropies, np.arange(640) % 64), 1)
    average = purity(np.arange(7), occurrences)
    assert average.estimate.value == pytest.approx((2.0**-entropies).mean(), rel=1e-12)
    # the jackknife over 64 folds knows an error to 9 %: 5 of that
    assert average.estimate.error == pytest.approx(stats.sem(2.0**-entropies), rel=0.45)
    assert average.from_few < 0.1


def test_a_mean_that_rests_on_a_hundredth_of_the_trajectories_has_no_error() -> None:
    occurrences = np.array([[1] + [0] * 15, [62] * 16])  # one trajectory of purity 1 among a thousand of 2^-20
    average = purity([0, 20], occurrences)
    assert average.from_few > 0.99
    assert average.estimate.error is None
    assert "hundredth of the trajectories" in average.estimate.withheld
