"""Variance of one trajectory at places not sampled yet, from a smooth curve through the measured ones."""

import numpy as np

from sweepmill.analysis.arrays import Matrix, Vector
from sweepmill.analysis.design.place import Candidates
from sweepmill.analysis.points import Points

_FAR = np.log(4.0)  # a measured variance this far from the curve counts as this far: bounds are not measurements


def smooth_variance(size: Vector, x: Vector, variance: Vector, sizes: Vector, places: Vector) -> Vector:
    """Variances at other sizes and places [m]: ln of it is quadratic in x and linear in ln(size), within what was seen.

    `size`, `x`, `variance` [n] are the measured ones.
    """
    target = np.log(variance)
    here, there = (_terms(size, x, *pair) for pair in ((size, x), (sizes, places)))
    keep = here.shape[1] if len(x) > here.shape[1] else 1
    here, there = here[:, :keep], there[:, :keep]
    fit = np.full(len(x), np.median(target))
    for _ in range(4):
        coefficients = np.linalg.lstsq(here, np.clip(target, fit - _FAR, fit + _FAR), rcond=None)[0]
        fit = here @ coefficients
    return np.asarray(np.exp(np.clip(there @ coefficients, fit.min(), fit.max())))


def place_variance(candidates: Candidates, points: Points, x: Vector) -> Vector:
    """Variances of one trajectory at all candidates: as measured where that is near the curve, else by the curve.

    `points` are those of the candidates with trajectories, `x` [n] any abscissa that variances go by.
    """
    placed = candidates.have > 0
    measured = candidates.have[placed] * points.error**2
    found = smooth_variance(candidates.size[placed], x[placed], measured, candidates.size, x)
    found[placed] = np.clip(measured, found[placed] / np.exp(_FAR), found[placed] * np.exp(_FAR))
    return found


def _terms(size: Vector, x: Vector, sizes: Vector, places: Vector) -> Matrix:
    middle, half = (x.max() + x.min()) / 2, max(float(np.ptp(x)) / 2, 1e-300)
    v = np.clip((places - middle) / half, -1.0, 1.0)
    logarithm = np.log(np.maximum(sizes, 1e-300) / size.min())
    return np.stack([np.ones_like(v), logarithm, v, v * v], axis=1)
