"""How well scaled curves fall on one, without a function for it: each size against a master curve from the others."""

import numpy as np

from sweepmill.analysis.arrays import Vector

_SHARED = 0.5  # of the points must lie on another curve, or the curves do not overlap enough to be compared


def quality(u: Vector, y: Vector, error: Vector, sizes: Vector) -> float:
    """Mean squared distance of every point from a straight line through its neighbors of the other sizes, in errors.

    All arguments [n]; about 1 for curves that fall on one, infinite where too few points overlap. The quality S of
    Phys. Rev. B 70, 014418 (2004), from memory.
    """
    w, wx, wxx, wy, wxy = np.zeros((5, len(u)))
    precision = error**-2
    for size in np.unique(sizes):
        of = np.flatnonzero(sizes == size)
        of = of[np.argsort(u[of])]
        above = np.searchsorted(u[of], u)
        inside = (sizes != size) & (above > 0) & (above < len(of))
        for shift in (0, 1):
            neighbor = of[np.clip(above - shift, 0, len(of) - 1)]
            weight = np.where(inside, precision[neighbor], 0.0)
            x, value = u[neighbor] - u, y[neighbor]  # measured from the point, so the line is wanted at 0
            w += weight
            wx += weight * x
            wxx += weight * x * x
            wy += weight * value
            wxy += weight * x * value
    determinant = w * wxx - wx * wx
    used = determinant > 1e-12 * w * wxx
    if used.mean() < _SHARED:
        return float("inf")
    master = (wxx * wy - wx * wxy)[used] / determinant[used]
    variance = wxx[used] / determinant[used]
    return float(np.mean((y[used] - master) ** 2 / (error[used] ** 2 + variance)))


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
