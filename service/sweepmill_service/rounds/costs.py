"""What a trajectory of each place costs, as a design weighs it."""

import math
from collections.abc import Sequence

from sweepmill.ensemble import Ensemble
from sweepmill_service.plan.costs import default_seconds_per_trajectory
from sweepmill_service.store.rounds import StoredPlace


def weighed_costs(places: Sequence[StoredPlace]) -> list[float]:
    """Core-seconds per trajectory, rounded to powers of two.

    Measured where the place was sampled; elsewhere the default, corrected by what places of that size, or else all,
    turned out to take. Rounding makes runs on different machines decide alike: a factor of the square root of two in a
    cost of one of two equal parts raises the work for a given error by 0.8 %, because N goes as cost^-1/2.
    """
    defaults = [default_seconds_per_trajectory(Ensemble.from_normal_form(place.normal_form)) for place in places]
    sizes = [place.normal_form.get("sites") for place in places]
    factors: dict[object, list[float]] = {}
    for place, default, size in zip(places, defaults, sizes, strict=True):
        if place.seconds:
            for group in (size, "all"):
                factors.setdefault(group, []).append(math.log(place.seconds / default))
    costs = []
    for place, default, size in zip(places, defaults, sizes, strict=True):
        logs = factors.get(size) or factors.get("all") or [0.0]
        costs.append(power_of_two(place.seconds or default * math.exp(sum(logs) / len(logs))))
    return costs


def power_of_two(number: float) -> float:
    """The nearest power of two in logarithms."""
    return float(2.0 ** round(math.log2(max(number, 1e-12))))
