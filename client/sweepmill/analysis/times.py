"""Times read off curves, one per size: when a state is purified, and how deep a circuit must be."""

import math
from collections.abc import Callable, Sequence

import numpy as np

from sweepmill.analysis.arrays import Vector
from sweepmill.analysis.compare import Comparison, fit_laws
from sweepmill.analysis.goodness import ACCEPTABLE
from sweepmill.analysis.jackknife import jackknife_error
from sweepmill.analysis.laws import DECAY, TIMES, Law
from sweepmill.analysis.points import Points

TimeOf = Callable[[Vector, Vector], float]  # from times and means, in ascending order of time; nan if there is none
_NUDGE = 1e-3


def times_by_size(points: Points, time_of: TimeOf) -> Points:
    """A time for every size of curves mean(x): points with sizes and x the size, mean and error the time.

    Errors by jackknife over the folds; without folds the errors of a curve's points are added up, which bounds their
    unknown correlation. Sizes whose curve gives no time are left out. Raises ValueError if that is all of them, or if
    a size has several ensembles.
    """
    found = [one for size in points.distinct_sizes() if (one := _time(points.taken(points.sizes == size), time_of))]
    if not found:
        raise ValueError("none of the curves gives a time: they must be followed for longer")
    sizes, times, errors = (np.array(column) for column in list(zip(*found, strict=True))[:3])
    keys = [one[4] for one in found] if points.keys else []
    replicas = np.stack([one[3] for one in found], axis=1) if points.replicas is not None else None
    return Points.of(sizes, sizes, times, errors, replicas, keys)


def _time(curve: Points, time_of: TimeOf) -> tuple[float, float, float, Vector, str] | None:
    if len(curve.ensembles) > 1:
        raise ValueError(f"size {curve.sizes[0]:g} has {len(curve.ensembles)} ensembles: one curve per size is needed")
    order = np.argsort(curve.x)
    x, mean, error = curve.x[order], curve.mean[order], curve.error[order]
    time, replicas = time_of(x, mean), np.empty(0)
    if math.isnan(time):
        return None
    if curve.replicas is not None:
        replicas = np.array([time_of(x, y) for y in curve.replicas[:, order]])
        spread = float(jackknife_error(replicas[:, None])[0])
    else:
        nudges = _NUDGE * np.diag(error)
        spread = sum(abs(time_of(x, mean + step) - time_of(x, mean - step)) for step in nudges) / (2 * _NUDGE)
    if not math.isfinite(spread) or spread <= 0:
        return None
    return float(curve.sizes[0]), time, spread, replicas, curve.keys[0] if curve.keys else ""


def purification_times(points: Points, threshold: float = 1.0) -> Points:
    """First time (layers, x) at which the mean entropy (bits) falls to the threshold, per size; ln S interpolated."""

    def time_of(x: Vector, mean: Vector) -> float:
        below = np.flatnonzero(mean <= threshold)
        if len(below) == 0 or below[0] == 0 or mean[below[0]] <= 0:
            return math.nan
        i = int(below[0])
        share = math.log(mean[i - 1] / threshold) / math.log(mean[i - 1] / mean[i])
        return float(x[i - 1] + share * (x[i] - x[i - 1]))

    return times_by_size(points, time_of)


def settling_depths(points: Points, within: float = 0.05) -> Points:
    """Last layer (x) at which the mean is further than a share `within` from that of the last quarter, per size."""

    def time_of(x: Vector, mean: Vector) -> float:
        final = float(mean[x > 0.75 * x[-1]].mean())
        if final == 0:
            return math.nan  # no share of nothing
        off = np.abs(mean / final - 1) - within
        outside = np.flatnonzero(off > 0)
        if len(outside) == 0 or x[outside[-1]] > 0.5 * x[-1]:
            return math.nan  # settled before the first reading, or not long enough ago to say
        i = int(outside[-1])
        return float(x[i] + (x[i + 1] - x[i]) * off[i] / (off[i] - off[i + 1]))

    return times_by_size(points, time_of)


def fit_times(times: Points, laws: Sequence[Law] = TIMES, acceptable: float = ACCEPTABLE) -> Comparison:
    """How times grow with size: a ln L + b (pure phase), a L^z (critical), a exp(rate L) (mixed phase).

    Dynamical purification phase transition induced by quantum measurements, Phys. Rev. X 10, 041020 (2020).
    """
    return fit_laws(times, laws, None, acceptable)


def fit_decay(points: Points, ring: float | None = None, acceptable: float = ACCEPTABLE) -> Comparison:
    """How a correlation such as mutual information falls with distance x: a x^-k or a exp(-rate x), with windows."""
    return fit_laws(points, DECAY, ring, acceptable)
