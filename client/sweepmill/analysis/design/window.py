"""Which points a critical point is fitted to: a fixed order of choices, the first that describes its points is taken.

All sizes first; then without the smallest, and so on down to two. For every choice of sizes the plain form, then, with
four sizes or more, the form with a correction L^-1; for either the widest window in the scaling variable first, then
narrower ones around the place just fitted. The polynomial is cubic as long as enough points are left, so neither
window nor degree is picked for the value or the error it gives.
"""

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from sweepmill.analysis.arrays import Mask
from sweepmill.analysis.fitted import Fitted
from sweepmill.analysis.goodness import ACCEPTABLE
from sweepmill.analysis.points import Points
from sweepmill.analysis.scaling import Scaling
from sweepmill.analysis.shapes import Polynomial

LEVELS = (0.05, ACCEPTABLE, 1e-4)
"""Least p-values, the next only where no choice reaches the one before: a right fit goes on to a narrower window in one
case of twenty; below the second nothing is quoted, but down to the third the fit still tells where to sample."""
_NARROWER = 0.75
_SPARE = 2  # degrees of freedom at least
_PLACES = 3  # per size at least
_CORRECTED = 4  # sizes at least for a correction to scaling


@dataclass(frozen=True, eq=False)
class Choice:
    """The points that were chosen, `keep` [n] of all, with their fit; `reach` is the largest |u| among them."""

    keep: Mask
    fitted: Fitted
    reach: float


def choose(points: Points) -> Choice | None:
    """The first choice whose fit describes its points at the first level any reaches; None if there is none."""
    choices: list[Choice] = []
    for choice in _choices(points):
        if not choice.fitted.faults(LEVELS[0]):
            return choice
        choices.append(choice)
    return next((one for level in LEVELS[1:] for one in choices if not one.fitted.faults(level)), None)


def _choices(points: Points) -> Iterator[Choice]:
    sizes = points.distinct_sizes()
    for index, smallest in enumerate(sizes[:-1]):
        for corrected in (False, True)[: 1 + (len(sizes) - index >= _CORRECTED)]:
            yield from _windows(points, points.sizes >= smallest, corrected)


def _windows(points: Points, keep: Mask, corrected: bool) -> Iterator[Choice]:
    while (form := _form(points.taken(keep), corrected)) is not None:
        fitted = Fitted.of(points.taken(keep), form)
        u = np.abs(fitted.frame.scaled(fitted.solution.theta, points.x, points.sizes))
        reach = float(u[keep].max())
        yield Choice(keep, fitted, reach)
        keep = keep & (u <= _NARROWER * reach)


def _form(points: Points, corrected: bool) -> Scaling | None:
    """The form these points can test: degree 3, or 2 where they are few; None where they are too few for that."""
    if len(points) == 0 or len(points.distinct_sizes()) < (_CORRECTED if corrected else 2):
        return None
    counts = [len(np.unique(points.x[points.sizes == size])) for size in points.distinct_sizes()]
    forms = (Scaling(Polynomial(degree), corrected=corrected) for degree in (3, 2))
    return next((one for one in forms if len(points) >= one.parameters() + _SPARE and min(counts) >= _PLACES), None)
