"""Judging the coefficient of a law: every size is sampled twice as far until the error is small enough."""

from collections.abc import Sequence

from sweepmill.analysis import fit_laws
from sweepmill.analysis.design import Advice, Place
from sweepmill.analysis.points import Points

SHRINKS = 2**0.5  # the error of twice as many trajectories


def advise_law(
    points: Points, places: Sequence[Place], law: str, coefficient: str, below: float, ring: float | None = None
) -> Advice:
    """The coefficient now, and the trajectories of the next round."""
    estimate = fit_laws(points, ring=ring)[law][coefficient]
    met = estimate.error is not None and estimate.error <= below
    targets = tuple(min(place.at_most, 2 * place.trajectories) for place in places)
    return Advice(estimate, met, targets, estimate.statistical / SHRINKS, f"{coefficient} = {estimate}")
