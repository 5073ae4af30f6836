"""Sums over folds of trajectories: what the jackknife and every fit needs beyond means and errors."""

from collections.abc import Sequence
from pathlib import Path
from typing import Self

import numpy as np
from numpy.typing import NDArray

from sweepmill.accumulate import Accumulator
from sweepmill.coordinates import Coordinate
from sweepmill.errors import SweepmillError
from sweepmill.table import FOLDS, Table

FORMATS = (".json", ".arrow", ".parquet")


def fold_ratios(
    accumulator: Accumulator, coordinates: Sequence[Coordinate]
) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Numerators and denominators, both [F, C], of the C coordinates in the F folds (fold of trajectory k: k mod F).

    The mean over a set R of folds is sum(numerators[R]) / sum(denominators[R]). Plain quantities have their sum in
    physical units and the number of trajectories; ratios have what was counted and what it was counted among.
    A fold without trajectories is a row of zeros. Raises ValueError for another number of coordinates.
    """
    if len(coordinates) != accumulator.coordinates:
        raise ValueError(f"{accumulator.coordinates} coordinates are summed, got the places of {len(coordinates)}")
    sums = accumulator.fold_sums.astype(np.float64)
    if accumulator.components == 2:
        return sums[:, :, 0], sums[:, :, 1]
    scale = np.array([place.scale for place in coordinates], dtype=np.float64)
    counts = np.repeat(accumulator.fold_counts.astype(np.float64)[:, None], len(scale), axis=1)
    return sums[:, :, 0] / scale, counts


class Folds(Table):
    """A table whose rows also have `numerators` and `denominators`: lists with one number for each fold.

    The mean over some folds is the sum of their numerators by that of their denominators. The number of folds may
    differ between rows; `sums` brings them to one number.
    """

    @classmethod
    def read(cls, path: str | Path) -> Self:
        """Read a file that `RemoteSweep.download_folds` wrote. Raises SweepmillError for that of a table."""
        folds = super().read(path)
        if not all(name in folds for name in FOLDS):
            raise SweepmillError(f"{path} has no folds: it is a table of means")
        return folds

    def sums(self) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
        """Numerators and denominators of all rows, both [F, rows], F the least number of folds of any row.

        Of more folds those that agree modulo F are put together: their trajectories do, too. Raises ValueError
        where F does not divide the number of folds of a row, or without rows.
        """
        if not len(self):
            raise ValueError("no rows, so no folds")
        least = min(len(values) for values in self.values(FOLDS[0]))
        top, bottom = (np.stack([_put_together(v, least) for v in self.values(name)], axis=1) for name in FOLDS)
        return top, bottom


def _put_together(values: Sequence[float], folds: int) -> NDArray[np.float64]:
    if len(values) % folds:
        raise ValueError(f"{len(values)} folds cannot be put together to {folds}")
    return np.asarray(np.reshape(np.asarray(values, dtype=np.float64), (-1, folds)).sum(axis=0))
