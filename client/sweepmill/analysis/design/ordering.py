"""Where curves of several sizes change their order: a crossing that needs no scaling function."""

from dataclasses import dataclass

import numpy as np

from sweepmill.analysis.arrays import Vector
from sweepmill.analysis.points import Points

_CLEAR = 3.0  # standard errors


@dataclass(frozen=True)
class Bracket:
    """The order of sizes is clear at both ends and opposite: the crossing lies between."""

    low: float
    high: float

    @property
    def width(self) -> float:
        """Its length."""
        return self.high - self.low


def bracket(points: Points) -> Bracket | None:
    """The narrowest interval between two abscissas at which the sizes stand clearly in opposite order; None without.

    The order at one abscissa is the slope of the means by ln(size), in standard errors.
    """
    x, order = _orders(points)
    if len(x) < 2:
        return None
    sums = np.cumsum(order)
    splits = np.abs(2 * sums[:-1] - sums[-1])
    split = int(np.argmax(splits)) + 1
    sign = np.sign(sums[split - 1])
    before = np.flatnonzero(sign * order[:split] > _CLEAR)
    after = split + np.flatnonzero(-sign * order[split:] > _CLEAR)
    return Bracket(float(x[before[-1]]), float(x[after[0]])) if len(before) and len(after) else None


def _orders(points: Points) -> tuple[Vector, Vector]:
    x, order = [], []
    for place in np.unique(points.x):
        at = points.x == place
        logarithm, weight = np.log(points.sizes[at]), points.error[at] ** -2
        centered = logarithm - np.average(logarithm, weights=weight)
        power = float(np.sum(weight * centered**2))
        if power > 0:
            x.append(float(place))
            order.append(float(np.sum(weight * centered * points.mean[at])) / np.sqrt(power))
    return np.array(x), np.array(order)
