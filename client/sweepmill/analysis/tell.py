"""What would tell two laws apart that the data do not: smaller errors, or points further out."""

import math
from dataclasses import dataclass

import numpy as np

from sweepmill.analysis.arrays import Vector
from sweepmill.analysis.goodness import information
from sweepmill.analysis.law_fit import FittedLaw
from sweepmill.analysis.laws import Law
from sweepmill.analysis.points import Points

DECISIVE = 20.0  # ratio of weights from which a law is ruled out against another
_POWER = 1.645  # a one-sided normal deviate: the data then decide with probability 95 % (common practice)
_OCTAVES, _REACH = 7, 100.0  # how far in x, and how much smaller in error, it is sensible to look


@dataclass(frozen=True)
class Need:
    """What would decide between two laws: errors smaller by `precision`, or points up to `reach` in x.

    None where nothing sensible would: `precision` beyond a factor of 100, `reach` beyond 7 octaves, or, on a ring,
    only longer rings.
    """

    law: str
    rival: str
    precision: float | None
    reach: float | None

    def __str__(self) -> str:
        ways = []
        if self.precision is not None:
            more = f"{self.precision**2:,.2g}" if self.precision**2 < 100 else f"{self.precision**2:,.0f}"
            ways.append(f"errors {self.precision:.2g} times smaller ({more} times the trajectories)")
        if self.reach is not None:
            ways.append(f"points up to x = {self.reach:.4g} of the same relative precision")
        return f"{self.law} against {self.rival}: " + (" or ".join(ways) or "nothing within reach would tell")


def what_would_tell(law: FittedLaw, rival: FittedLaw) -> Need:
    """The need if either of two fitted laws is the truth; only the richer one's if it contains the other."""
    pairs = [(law, rival), (rival, law)]
    names = (law.law.name, rival.law.name)
    if rival.law.name in law.law.contains:
        pairs = pairs[:1]
    elif law.law.name in rival.law.contains:
        pairs = pairs[1:]
    precisions = [_precision(truth, other.law) for truth, other in pairs]
    reaches = [_reach(truth, other.law) for truth, other in pairs]
    return Need(*names, _largest(precisions), _largest(reaches))


def _largest(needs: list[float | None]) -> float | None:
    known = [need for need in needs if need is not None]
    return max(known) if len(known) == len(needs) else None


def _needed(truth: FittedLaw, other: Law) -> float:
    """The chi^2 by which the wrong law must miss the right one, on average, for a decision 95 % of the time.

    The difference of chi^2 of two fits then has mean m and standard deviation 2 sqrt(m) (common practice).
    """
    whitening, nothing = truth.solution.problem.whitening, np.zeros(len(truth.points))
    penalty = information(whitening, nothing, truth.law.parameters) - information(whitening, nothing, other.parameters)
    threshold = 2 * math.log(DECISIVE) + max(0.0, penalty if math.isfinite(penalty) else 0.0)
    return (_POWER + math.sqrt(_POWER**2 + threshold)) ** 2


def _precision(truth: FittedLaw, other: Law) -> float | None:
    exact = truth.points.with_mean(truth.predicted(truth.points.x))
    missed = _miss(exact, truth, other)
    factor = math.sqrt(_needed(truth, other) / missed) if missed > 0 else math.inf
    return max(factor, 1.0) if factor <= _REACH else None


def _reach(truth: FittedLaw, other: Law) -> float | None:
    if truth.ring is not None:
        return None  # a ring of another size is another curve
    needed, points = _needed(truth, other), truth.points
    for octave in range(1, _OCTAVES + 1):
        x = _further(points.x, octave)
        relative = float(points.error[np.argmax(points.x)] / abs(points.mean[np.argmax(points.x)]))
        mean = truth.predicted(x)
        error = np.concatenate([points.error, relative * np.abs(mean[len(points) :])])
        if _miss(Points.of(x, x, mean, np.maximum(error, 1e-300)), truth, other) > needed:
            return float(x.max())
    return None


def _further(x: Vector, octaves: int) -> Vector:
    """x and points beyond it, as dense in ln x as those of its upper half."""
    upper = np.sort(x)[len(x) // 2 :]
    per_octave = max(1, round((len(upper) - 1) / math.log2(upper[-1] / upper[0]))) if upper[-1] > upper[0] else 1
    steps = np.arange(1, octaves * per_octave + 1) / per_octave
    return np.concatenate([x, x.max() * 2.0**steps])


def _miss(exact: Points, truth: FittedLaw, other: Law) -> float:
    """The least chi^2 of the other law on the curve of the right one, with the whitening of the data where it fits."""
    same = len(exact) == len(truth.points)
    return FittedLaw.of(
        exact, other, truth.ring, None, truth.solution.problem.whitening if same else None
    ).solution.chi2
