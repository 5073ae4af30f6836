"""From exact accumulators to means and standard errors: exact integers until the last division.

One trajectory is one independent sample. A ratio's error is that of the linearized ratio of means.
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass

from sweepmill.accumulate import Accumulator
from sweepmill.coordinates import Coordinate


@dataclass(frozen=True)
class Moments:
    """One coordinate in physical units; nan where a number is undefined.

    ``bound`` tells that the sample hardly varies, so that ``standard_error`` is a bound: the error with one more
    trajectory differing by one unit (one bit; one outcome for a ratio). It is never 0.
    """

    mean: float
    standard_error: float
    variance: float
    minimum: float
    maximum: float
    bound: bool


def summarize(accumulator: Accumulator, coordinates: Sequence[Coordinate]) -> list[Moments]:
    """Moments of every coordinate, in order."""
    sums, products = accumulator.sums.tolist(), accumulator.products.tolist()
    least, most = accumulator.minimum.tolist(), accumulator.maximum.tolist()
    varied = accumulator.tally.varied.tolist()
    count = accumulator.count
    if accumulator.components == 2:
        return [_ratio(count, sums[i], products[i], varied[i]) for i in range(len(coordinates))]
    return [
        _plain(count, sums[i][0], products[i][0], least[i][0], most[i][0], place.scale, varied[i])
        for i, place in enumerate(coordinates)
    ]


def _plain(count: int, total: int, squares: int, least: int, most: int, scale: int, varied: bool) -> Moments:
    mean = total / (count * scale)
    if count < 2:
        return Moments(mean, math.nan, math.nan, least / scale, most / scale, not varied)
    variance = (count * squares - total * total) / (count * (count - 1) * scale * scale)
    error = _error(count, variance, 1.0, varied)
    return Moments(mean, error, variance, least / scale, most / scale, not varied)


def _ratio(count: int, sums: list[int], products: list[int], varied: bool) -> Moments:
    (top, bottom), (nn, nd, dd) = sums, products
    if bottom == 0:
        return Moments(math.nan, math.nan, math.nan, math.nan, math.nan, True)
    if count < 2:
        return Moments(top / bottom, math.nan, math.nan, math.nan, math.nan, not varied)
    residuals = bottom * bottom * nn - 2 * top * bottom * nd + top * top * dd
    variance = (count * count * residuals) / (bottom**4 * (count - 1))
    error = _error(count, variance, count / bottom, varied)
    return Moments(top / bottom, error, variance, math.nan, math.nan, not varied)


def _error(count: int, variance: float, unit: float, varied: bool) -> float:
    extra = 0.0 if varied else unit * unit / count
    return math.sqrt((variance + extra) / count)


def rule_met(accumulator: Accumulator, coordinates: Sequence[Coordinate], below: float) -> bool:
    """Whether the standard error of every coordinate is below the bound."""
    return all(moments.standard_error < below for moments in summarize(accumulator, coordinates))


def needed_trajectories(accumulator: Accumulator, coordinates: Sequence[Coordinate], below: float) -> int:
    """Predicted N at which the rule holds: errors fall as N^-1/2, the bound of a constant sample as 1/N."""
    needed = 2.0
    for moments in summarize(accumulator, coordinates):
        if math.isnan(moments.standard_error):
            continue
        constant = moments.bound and moments.variance == 0
        needed = max(needed, (moments.standard_error / below) ** (1 if constant else 2) * accumulator.count)
    return math.ceil(min(needed, 2.0**62))
