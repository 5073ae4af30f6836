"""How well scaled curves fall on one, without a function for it: each size against a master curve from the others."""

import numpy as np

from sweepmill.analysis.arrays import Mask, Vector

_SHARED = 0.5  # of the points must lie on another curve, or the curves do not overlap enough to be compared


def quality(u: Vector, y: Vector, error: Vector, sizes: Vector) -> float:
    """Mean squared distance of every point from a straight line through its neighbors of the other sizes, in errors.

    All arguments [n]; about 1 for curves that fall on one, infinite where too few points overlap. The quality S of
    Phys. Rev. B 70, 014418 (2004), from memory.
    """
    order = np.lexsort((u, sizes))  # ascending u within every size
    away = _distances(u[order], y[order], error[order], sizes[order])
    if len(away) < _SHARED * len(u):
        return float("inf")
    return float(np.sum(away**2) / len(away))


def deviations(u: Vector, y: Vector, error: Vector, sizes: Vector) -> Vector:
    """The distances [n] whose squares `quality` averages, in the order of the points; nan outside the other sizes."""
    order = np.lexsort((u, sizes))
    inside = np.flatnonzero(_others(u[order], y[order], error[order], sizes[order])[0])
    away: Vector = np.full(len(u), np.nan)
    away[order[inside]] = _distances(u[order], y[order], error[order], sizes[order])
    return away


def _distances(u: Vector, y: Vector, error: Vector, sizes: Vector) -> Vector:
    """Of the points that lie among other sizes, in errors; u ascends within every size."""
    used, master, variance = _others(u, y, error, sizes)
    return np.asarray((y[used] - master) / np.sqrt(error[used] ** 2 + variance))


def _others(u: Vector, y: Vector, error: Vector, sizes: Vector) -> tuple[Mask, Vector, Vector]:
    """Which points lie among other sizes, and of those the value of the line through these and its variance."""
    starts = np.flatnonzero(np.concatenate([[True], sizes[1:] != sizes[:-1]]))
    counts = np.diff(np.append(starts, len(u)))[:, None]
    # rows: sizes; columns: points. How many points of the size lie below, and the neighbors on both sides
    above = np.add.reduceat(u[:, None] < u[None, :], starts, axis=0, dtype=np.intp)
    inside = (above > 0) & (above < counts) & (sizes[starts][:, None] != sizes)
    upper = starts[:, None] + np.minimum(above, counts - 1)
    neighbors = np.concatenate([upper, np.maximum(upper - 1, 0)])
    weight = np.concatenate([inside, inside]) * error[neighbors] ** -2
    x, value = u[neighbors] - u, y[neighbors]  # measured from the point, so the line is wanted at 0
    w, wx, wy = weight.sum(axis=0), (weight * x).sum(axis=0), (weight * value).sum(axis=0)
    wxx, wxy = (weight * x * x).sum(axis=0), (weight * x * value).sum(axis=0)
    determinant = w * wxx - wx * wx
    used = determinant > 1e-12 * w * wxx
    return used, (wxx * wy - wx * wxy)[used] / determinant[used], wxx[used] / determinant[used]


def residual(u: Vector, y: Vector, error: Vector, sizes: Vector) -> float:
    """Mean absolute distance of every point from the interpolated curve of every other size, per spread of y.

    The measure P_b with exponent 1 of A measure of data collapse for scaling, J. Phys. A 34, 6375 (2001), with linear
    interpolation, divided by the standard deviation of y so that a free power of L cannot shrink it; `error` is not
    used.
    """
    distances = []
    for size in np.unique(sizes):
        of = np.flatnonzero(sizes == size)
        of = of[np.argsort(u[of])]
        inside = (sizes != size) & (u >= u[of[0]]) & (u <= u[of[-1]])
        distances.append(np.abs(y[inside] - np.interp(u[inside], u[of], y[of])))
    together = np.concatenate(distances)
    if len(together) < _SHARED * len(u):
        return float("inf")
    return float(np.mean(together) / np.std(y))
