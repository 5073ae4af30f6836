"""Rounds without a fit to go by: look everywhere the crossing can be."""

import numpy as np

from sweepmill.analysis.arrays import Vector
from sweepmill.analysis.design.allocation import filled
from sweepmill.analysis.design.noise import place_variance
from sweepmill.analysis.design.ordering import Bracket
from sweepmill.analysis.design.place import Candidates
from sweepmill.analysis.points import Points

_VALUES = 7  # per size across the range that is left


def spread_out(candidates: Candidates, points: Points, within: Bracket | None) -> Vector:
    """Trajectories [n] after a round of twice the core-seconds or with new values, over the bounds or a bracket.

    Every size gets some values across the range, those it has already where they are near; trajectories go by the
    square root of variance over cost, so that no size takes all.
    """
    low, high = (within.low, within.high) if within else (float(candidates.x.min()), float(candidates.x.max()))
    margin = (high - low) / 2 if within else 0.0
    shape = np.zeros(len(candidates))
    for size in np.unique(candidates.size):
        of = np.flatnonzero(candidates.size == size)
        for value in np.linspace(low - margin, high + margin, _VALUES):
            shape[_nearest(candidates, of, float(value), (high - low + 2 * margin) / (2 * _VALUES))] = 1.0
    shape *= np.sqrt(place_variance(candidates, points, candidates.x) / candidates.cost)
    grown = filled(shape, candidates.cost, candidates.have, candidates.most, candidates.spent)
    opening = np.minimum(candidates.opening, candidates.most)
    return np.where((candidates.have == 0) & (shape > 0), np.maximum(grown, opening), grown)


def _nearest(candidates: Candidates, of: np.ndarray[tuple[int], np.dtype[np.int64]], value: float, near: float) -> int:
    old = of[candidates.have[of] > 0]
    far = np.abs(candidates.x[old] - value)
    if len(old) and far.min() <= near:
        return int(old[np.argmin(far)])
    return int(of[np.argmin(np.abs(candidates.x[of] - value))])
