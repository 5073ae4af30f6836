"""Sums over folds of trajectories: what the jackknife and every fit needs beyond means and errors."""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from sweepmill.accumulate import Accumulator
from sweepmill.coordinates import Coordinate


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
