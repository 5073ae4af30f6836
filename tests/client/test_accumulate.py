import itertools
from fractions import Fraction
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from sweepmill.accumulate import Accumulator, folds_for, merged
from sweepmill.counts import VARIED_FROM
from sweepmill.errors import AccumulatorMismatch, AccumulatorOverflow
from sweepmill.exact import add, narrow

SMALL, HUGE = st.integers(-5, 5), st.integers(-(2**62), 2**62)


@st.composite
def samples(draw: st.DrawFn, elements: st.SearchStrategy[int] = SMALL | HUGE) -> np.ndarray[Any, Any]:
    """Raw values [n, C, K] of a few trajectories."""
    shape = draw(st.tuples(st.integers(1, 12), st.integers(1, 3), st.integers(1, 2)))
    size = int(np.prod(shape))
    flat = draw(st.lists(elements, min_size=size, max_size=size))
    return np.array(flat, dtype=np.int64).reshape(shape)


@settings(max_examples=150, deadline=None)
@given(samples(), st.integers(0, 2**40))
def test_sums_squares_and_folds_are_exact_integers_of_any_size(values: np.ndarray[Any, Any], first: int) -> None:
    total = Accumulator.from_values(values, first)
    exact = values.astype(object)
    components = values.shape[2]
    pairs = [(i, j) for i in range(components) for j in range(i, components)]
    assert total.sums.tolist() == exact.sum(axis=0).tolist()
    assert total.products.T.tolist() == [(exact[..., i] * exact[..., j]).sum(axis=0).tolist() for i, j in pairs]
    assert total.fold_sums.astype(object).sum(axis=0).tolist() == total.sums.tolist()  # int64 would wrap here
    assert int(total.fold_counts.sum()) == total.count == len(values)
    for k, row in enumerate(exact, start=first):
        assert total.fold_sums[k % 64].tolist() == row.tolist()  # at most 12 trajectories: one in a fold


@settings(max_examples=150, deadline=None)
@given(samples(), st.data())
def test_merging_does_not_depend_on_how_a_range_was_split_or_ordered(
    values: np.ndarray[Any, Any], data: st.DataObject
) -> None:
    cuts = sorted(data.draw(st.sets(st.integers(1, len(values) - 1) if len(values) > 1 else st.nothing())))
    readings = values[:, :, :1] % 7
    edges = [0, *cuts, len(values)]
    parts = [Accumulator.from_values(values[a:b], 100 + a, readings[a:b]) for a, b in itertools.pairwise(edges)]
    whole = Accumulator.from_values(values, 100, readings)
    assert merged(data.draw(st.permutations(parts))) == whole
    assert merged(parts).digest == whole.digest


@settings(max_examples=100, deadline=None)
@given(samples())
def test_bytes_restore_the_same_accumulator(values: np.ndarray[Any, Any]) -> None:
    total = Accumulator.from_values(values, 3, values[:, :, :1] % 7)
    again = Accumulator.from_bytes(total.to_bytes())
    assert again == total
    assert again.merge(again).to_bytes() == total.merge(total).to_bytes()


def test_bytes_of_something_else_are_refused() -> None:
    with pytest.raises(ValueError, match="not an accumulator"):
        Accumulator.from_bytes(b"x" * 100)


def test_sums_beyond_64_bits_stay_exact_and_beyond_127_bits_are_refused() -> None:
    near = np.full((4, 1), 2**62, dtype=np.int64)
    total = Accumulator.from_values(near, 0)
    assert int(total.sums[0, 0]) == 2**64
    assert int(total.products[0, 0]) == 4 * 2**124
    with pytest.raises(AccumulatorOverflow):
        total.merge(total)  # 2^127 is the first sum of squares that does not fit
    assert add(narrow(np.array([2**63 - 1])), np.array([1])).tolist() == [2**63]


def test_the_least_64_bit_integer_has_one_spelling_however_it_came_about() -> None:
    half = np.array([-(2**62)])
    by_machine, by_python = add(half, half), narrow(half.astype(object) + half.astype(object))
    assert by_machine.tolist() == by_python.tolist() == [-(2**63)]
    assert by_machine.dtype == by_python.dtype == np.int64


def test_a_sum_that_fits_again_has_one_spelling() -> None:
    a, b = np.array([[2**62], [2**62]]), np.array([[-(2**62)], [-(2**62)]])
    there = Accumulator.from_values(a, 0).merge(Accumulator.from_values(b, 2))
    assert there == Accumulator.from_values(np.vstack([a, b]), 0)
    assert there.sums.dtype == np.int64


def test_accumulators_of_different_shapes_do_not_merge() -> None:
    one, two = np.ones((2, 1), dtype=np.int64), np.ones((2, 2), dtype=np.int64)
    with pytest.raises(AccumulatorMismatch):
        Accumulator.from_values(one, 0).merge(Accumulator.from_values(two, 2))


def test_64_folds_up_to_256_coordinates_then_16() -> None:
    assert (folds_for(1), folds_for(256), folds_for(257)) == (64, 64, 16)


@settings(max_examples=100, deadline=None)
@given(st.lists(st.sampled_from([0, 0, 0, 0, 1, 2, 7]), min_size=1, max_size=90), st.data())
def test_a_coordinate_has_varied_when_30_trajectories_differ_from_the_most_frequent_value(
    values: list[int], data: st.DataObject
) -> None:
    array = np.array(values, dtype=np.int64)[:, None]
    cut = data.draw(st.integers(1, len(values)))
    parts = [Accumulator.from_values(array[:cut], 0)]
    if cut < len(values):
        parts.append(Accumulator.from_values(array[cut:], cut))
    total = merged(parts[::-1])
    differing = len(values) - max(values.count(value) for value in set(values))
    assert bool(total.tally.varied[0]) == (differing >= VARIED_FROM)


def test_ratios_vary_only_with_the_ratio_itself() -> None:
    counts = np.arange(1, 101)
    constant = np.stack([counts, 2 * counts], axis=1)[:, None, :]
    changing = np.stack([counts, np.full(100, 200)], axis=1)[:, None, :]
    assert not Accumulator.from_values(constant, 0).tally.varied[0]
    assert Accumulator.from_values(changing, 0).tally.varied[0]


def test_the_histogram_counts_every_reading_by_coordinate_value_and_fold() -> None:
    readings = np.array([[[1, 1], [0, 5]], [[1, 2], [0, 0]], [[-3, 2], [0, 0]]])
    total = Accumulator.from_values(readings.sum(axis=2), 63, readings)
    assert total.histogram is not None
    counts = {(c, v): rows for c, v, *rows in total.histogram.tolist()}
    assert {at: sum(rows) for at, rows in counts.items()} == {
        (0, -3): 1,
        (0, 1): 3,
        (0, 2): 2,
        (1, 0): 5,
        (1, 5): 1,
    }
    assert (counts[0, 1][63], counts[0, 1][0], counts[0, -3][1]) == (2, 1, 1)


def test_a_histogram_spread_over_all_integers_is_refused() -> None:
    readings = np.array([[[-(2**62), 2**62]]])
    with pytest.raises(AccumulatorOverflow, match="cannot span"):
        Accumulator.from_values(readings.sum(axis=2), 0, readings)


def test_an_average_from_folds_is_the_average_of_all() -> None:
    values = np.arange(200, dtype=np.int64)[:, None]
    total = Accumulator.from_values(values, 7)
    folds = [Fraction(int(s), int(n)) for s, n in zip(total.fold_sums[:, 0, 0], total.fold_counts, strict=True)]
    weighted = sum(f * int(n) for f, n in zip(folds, total.fold_counts, strict=True)) / 200
    assert weighted == Fraction(199, 2)
