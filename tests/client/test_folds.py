"""Fold sums against numpy on the trajectories themselves."""

import numpy as np
import pytest

from sweepmill.accumulate import Accumulator, folds_for
from sweepmill.coordinates import Coordinate
from sweepmill.folds import fold_ratios
from sweepmill.statistics import summarize


def test_folds_of_a_plain_quantity_are_sums_in_physical_units_and_trajectory_numbers() -> None:
    values = np.random.default_rng(3).integers(-9, 40, size=(150, 2))
    places = (Coordinate(4, None, 8), Coordinate(8, None, 3))
    total = Accumulator.from_values(values, first=100)
    numerators, denominators = fold_ratios(total, places)
    assert numerators.shape == denominators.shape == (folds_for(2), 2)
    fold = (100 + np.arange(150)) % 64
    for r in range(64):
        assert numerators[r] == pytest.approx(values[fold == r].sum(axis=0) / [8, 3], rel=1e-15)
        assert denominators[r].tolist() == [(fold == r).sum()] * 2
    means = [moments.mean for moments in summarize(total, places)]
    assert numerators.sum(axis=0) / denominators.sum(axis=0) == pytest.approx(means, rel=1e-14)


def test_folds_of_a_ratio_are_what_was_counted_and_among_what() -> None:
    generator = np.random.default_rng(4)
    bottom = generator.integers(20, 40, size=(90, 1))
    pairs = np.stack([generator.binomial(bottom, 0.9), bottom], axis=2)
    numerators, denominators = fold_ratios(Accumulator.from_values(pairs, 0), (Coordinate(None, None, 1),))
    fold = np.arange(90) % 64
    for column, sums in enumerate((numerators, denominators)):
        assert sums[:, 0].tolist() == [pairs[fold == r, 0, column].sum() for r in range(64)]


def test_sums_beyond_64_bits_and_empty_folds_are_read_as_well() -> None:
    total = Accumulator.from_values(np.full((3, 1), 2**62), 0).merge(Accumulator.from_values(np.full((3, 1), 2**62), 0))
    numerators, denominators = fold_ratios(total, (Coordinate(None, None, 2),))
    assert numerators[:4, 0].tolist() == [2.0**62] * 3 + [0.0]
    assert denominators[:4, 0].tolist() == [2, 2, 2, 0]


def test_places_that_are_not_those_of_the_total_are_refused() -> None:
    total = Accumulator.from_values(np.ones((2, 3), dtype=np.int64), 0)
    with pytest.raises(ValueError, match="3 coordinates are summed, got the places of 1"):
        fold_ratios(total, (Coordinate(None, None, 1),))
