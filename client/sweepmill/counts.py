"""Exact counts of integer values: the tally of samples that hardly vary, and histograms.

Both are tables of int64 rows sorted by their leading columns, so that equal content has equal bytes.
"""

from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sweepmill.errors import AccumulatorOverflow

VARIED_FROM = 30  # trajectories that must differ from the most frequent value before a variance is trusted

Rows = NDArray[np.int64]


def merge_rows(rows: Rows, keys: int) -> Rows:
    """Rows equal in their first ``keys`` columns become one; the other columns are added up."""
    if not len(rows):
        return rows
    order = np.lexsort(rows[:, keys - 1 :: -1].T)
    rows = rows[order]
    new = np.ones(len(rows), dtype=bool)
    new[1:] = (rows[1:, :keys] != rows[:-1, :keys]).any(axis=1)
    starts = np.flatnonzero(new)
    return np.hstack([rows[starts, :keys], np.add.reduceat(rows[:, keys:], starts, axis=0)])


class Tally(NamedTuple):
    """Which coordinates have varied, and for the others every value with its count.

    ``varied`` is bool [C]; ``rows`` int64 [E, 1 + V + 1]: coordinate, the V integers of a value, count. A coordinate
    has varied once at least 30 trajectories differ from its most frequent value. More trajectories cannot undo that,
    so the state depends on the set of trajectories only, not on the order in which parts of it were merged.
    """

    varied: NDArray[np.bool_]
    rows: Rows

    def settle(self) -> "Tally":
        """Merge equal values and drop the rows of coordinates that have varied by now."""
        width = self.rows.shape[1] - 1
        rows = merge_rows(self.rows[~self.varied[self.rows[:, 0]]], width)
        differing = _total(rows, len(self.varied)) - _most(rows, len(self.varied))
        varied = self.varied | (differing >= VARIED_FROM)
        return Tally(varied, rows[~varied[rows[:, 0]]])

    def merge(self, other: "Tally") -> "Tally":
        """The tally of both samples together."""
        return Tally(self.varied | other.varied, np.vstack([self.rows, other.rows])).settle()


def tally_of(values: NDArray[np.int64]) -> Tally:
    """Tally of values [n, C, V]; a value (0, 0) of a ratio says nothing and is left out."""
    count, coordinates, width = values.shape
    rows = np.empty((count, coordinates, width + 2), dtype=np.int64)
    rows[:, :, 0] = np.arange(coordinates)
    rows[:, :, 1:-1] = values if width == 1 else _reduced(values)
    rows[:, :, -1] = 1
    flat = rows.reshape(-1, width + 2)
    if width == 2:
        flat = flat[(flat[:, 1:3] != 0).any(axis=1)]
    return Tally(np.zeros(coordinates, dtype=bool), flat).settle()


def histogram_of(readings: NDArray[np.int64], folds: NDArray[np.int64], fold_count: int) -> Rows:
    """Histogram rows [H, 2 + F] of single readings [n, C, m]: coordinate, value, occurrences in each fold.

    Raises AccumulatorOverflow for values spread over more than about 2^57.
    """
    coordinates, lowest = readings.shape[1], int(readings.min())
    span = int(readings.max()) - lowest + 1
    if coordinates * span * fold_count >= 2**63:
        raise AccumulatorOverflow(f"a histogram of {coordinates} coordinates cannot span {span} values")
    bins = np.arange(coordinates)[None, :, None] * span + (readings - lowest)
    codes, occurrences = np.unique(bins * fold_count + folds[:, None, None], return_counts=True)
    used, row = np.unique(codes // fold_count, return_inverse=True)
    rows = np.zeros((len(used), 2 + fold_count), dtype=np.int64)
    rows[:, 0], rows[:, 1] = used // span, used % span + lowest
    rows[row, 2 + codes % fold_count] = occurrences
    return rows


def _reduced(pairs: NDArray[np.int64]) -> NDArray[np.int64]:
    divisor = np.gcd(pairs[..., 0], pairs[..., 1])
    return pairs // np.maximum(divisor, 1)[..., None]


def _total(rows: Rows, coordinates: int) -> NDArray[np.int64]:
    total = np.zeros(coordinates, dtype=np.int64)
    np.add.at(total, rows[:, 0], rows[:, -1])
    return total


def _most(rows: Rows, coordinates: int) -> NDArray[np.int64]:
    most = np.zeros(coordinates, dtype=np.int64)
    np.maximum.at(most, rows[:, 0], rows[:, -1])
    return most
