"""What a sweep is expected to come to: trajectories, core-seconds and standard errors, each with its uncertainty.

All of it is a function of a list of points (ensembles with their caps), whichever rule made the list.
"""

import math
from bisect import bisect_left
from collections.abc import Mapping, Sequence
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sweepmill.sweep import Point
from sweepmill_service.cost import Costs
from sweepmill_service.learning.scatter import Scatter
from sweepmill_service.plan.marks import ladder

Floats = NDArray[np.float64]


class Uncertain(NamedTuple):
    """A positive number, and the standard deviation of its logarithm."""

    value: float
    deviation: float

    @property
    def range(self) -> tuple[float, float]:
        """Where it is two times out of three."""
        return self.value * math.exp(-self.deviation), self.value * math.exp(self.deviation)


class Goal(NamedTuple):
    """Where points stop: the first N judged, and the standard errors to fall below, by name of the observation."""

    at_least: int
    below: Mapping[str, float]


def needed(points: Sequence[Point], goal: Goal, scatters: Mapping[str, Scatter], shift: float = 0.0) -> Floats:
    """Trajectories [points] after which each settles, if logarithms of scatters are ``shift`` deviations higher."""
    caps = np.array([point.cap for point in points], dtype=float)
    if not goal.below:
        return caps
    wanted = np.full(len(points), 2.0)
    for name, below in goal.below.items():
        one = scatters[name]
        wanted = np.maximum(wanted, (one.values * np.exp(shift * one.deviations) / below) ** 2)
    return np.array([_rung(point, goal, number) for point, number in zip(points, wanted, strict=True)])


def _rung(point: Point, goal: Goal, number: float) -> float:
    """The first N at which a point is judged that is no less than what it needs."""
    steps = ladder(goal.at_least, point.cap, has_rules=True)
    return float(steps[min(bisect_left(steps, number), len(steps) - 1)])


def total_seconds(points: Sequence[Point], missing: Floats, costs: Costs) -> Uncertain:
    """Core-seconds of so many trajectories of each point."""
    seconds = {
        point.ensemble.key: number * costs[point.ensemble.key].seconds
        for point, number in zip(points, missing.tolist(), strict=True)
        if number > 0
    }
    return Uncertain(sum(seconds.values()), costs.deviation_of_sum(seconds))


def expected_seconds(
    points: Sequence[Point], there: Floats, goal: Goal, scatters: Mapping[str, Scatter], costs: Costs
) -> Uncertain:
    """Core-seconds until every point settles; errors of the scatters are taken to be the same everywhere."""

    def missing(numbers: Floats) -> Floats:
        return np.maximum(numbers - there, 0.0)

    middle = total_seconds(points, missing(needed(points, goal, scatters)), costs)
    if not goal.below or middle.value <= 0:
        return middle
    low, high = (total_seconds(points, missing(needed(points, goal, scatters, shift)), costs) for shift in (-1.0, 1.0))
    return Uncertain(middle.value, math.hypot(middle.deviation, _half_width(low.value, middle.value, high.value)))


def _half_width(low: float, middle: float, high: float) -> float:
    """Deviation of the logarithm of which these are one below, in the middle, and one above."""
    least = 1e-3 * middle
    return math.log(max(high, least) / max(low, least)) / 2


class Error(NamedTuple):
    """Standard errors of one observation: the largest and the median over points, None where nothing tells."""

    name: str
    largest: Uncertain | None
    median: float | None
    sources: frozenset[str]


def expected_error(name: str, numbers: Floats, scatter: Scatter) -> Error:
    """Standard errors of an observation once so many trajectories of each point are sampled."""
    sources = frozenset(scatter.sources)
    if "unknown" in sources:
        return Error(name, None, None, sources)
    errors = scatter.values / np.sqrt(numbers)
    worst = int(np.argmax(errors))
    largest = Uncertain(float(errors[worst]), float(scatter.deviations[worst]))
    return Error(name, largest, float(np.median(errors)), sources)


def reachable(points: Sequence[Point], scatter: Scatter, below: float) -> int:
    """How many points are expected to meet a rule before their caps."""
    caps = np.array([point.cap for point in points], dtype=float)
    return int((scatter.values / np.sqrt(caps) < below).sum())
