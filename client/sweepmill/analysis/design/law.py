"""Judging a coefficient of an entanglement law and saying where the next round shrinks its error most."""

import math
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from sweepmill.analysis.arrays import Mask, Vector
from sweepmill.analysis.design.allocation import Informations, filled
from sweepmill.analysis.design.linear import gradients
from sweepmill.analysis.design.noise import smooth_variance
from sweepmill.analysis.design.place import Advice, Candidates, Place
from sweepmill.analysis.design.rounds import Plan
from sweepmill.analysis.design.verdict import improved, met, told
from sweepmill.analysis.estimate import Estimate
from sweepmill.analysis.goodness import ACCEPTABLE
from sweepmill.analysis.law_drift import law_rows
from sweepmill.analysis.law_estimates import estimates_of
from sweepmill.analysis.law_fit import FittedLaw
from sweepmill.analysis.laws import ENTANGLEMENT, Law
from sweepmill.analysis.points import Points
from sweepmill.analysis.separable import Solution

Indices = NDArray[np.int64]

DESCRIBES = 0.05  # least p-value, as for critical points
_CUTS = 8  # choices of the smallest x at most


def advise_law(
    points: Points, places: Sequence[Place], law: str, coefficient: str, below: float, ring: float | None = None
) -> Advice:
    """The coefficient of a law, and the trajectories every place should have after the next round.

    The points of one ensemble (several positions, by key) belong to one place; ensembles appear in the points in the
    order of the places with trajectories. Small x are left out one after another until the law describes the rest.
    Raises ValueError for a law or coefficient that is not known, or points that do not fit the places.
    """
    form = _law(law, coefficient)
    candidates = Candidates.of(places)
    owner = _owner(points, candidates)
    fitted = _choose(points, form, ring)
    if fitted is None:
        trouble = f"the law {law} does not describe the data"
        estimate = Estimate(math.nan, math.nan, 0.0, trouble)
        return told(estimate, _spread(points, candidates, owner), math.nan, f"{trouble}: all places grow", candidates)
    rows = law_rows(fitted, ACCEPTABLE)
    estimate = estimates_of(fitted, rows, tuple(fitted.faults(DESCRIBES)))[coefficient]
    return met(estimate, coefficient, candidates, below) or improved(
        estimate, coefficient, candidates, _plan(points, fitted, candidates, owner, coefficient), below
    )


def _law(name: str, coefficient: str) -> Law:
    known = {law.name: law for law in ENTANGLEMENT}
    if name not in known:
        raise ValueError(f"no law is called {name!r}: one of {', '.join(known)}")
    law = known[name]
    names = [*law.coefficients, *([law.exponent.name] if law.exponent else [])]
    names += [f"{law.logarithm}_log2"] if law.logarithm else []
    if coefficient not in names:
        raise ValueError(f"{law.formula} has no coefficient {coefficient!r}: one of {', '.join(names)}")
    return law


def _owner(points: Points, candidates: Candidates) -> Indices:
    """Which candidate every point [n] belongs to."""
    placed = np.flatnonzero(candidates.have > 0)
    keys = points.keys or tuple(str(index) for index in range(len(points)))
    order = list(dict.fromkeys(keys))
    if len(order) != len(placed):
        raise ValueError(f"{len(order)} ensembles of points do not fit {len(placed)} places with trajectories")
    return np.array([placed[order.index(key)] for key in keys], dtype=np.int64)


def _choose(points: Points, law: Law, ring: float | None) -> FittedLaw | None:
    """The fit without the fewest small x that describes its data, with at least one degree of freedom.

    Half of the x are kept at least: a law of the few largest is none.
    """
    x = np.unique(points.x)
    step = max(1, round(len(x) / _CUTS))
    for cut in x[: len(x) // 2 + 1 : step]:
        part = points.taken(points.x >= cut)
        if len(part) <= law.parameters:
            return None
        fitted = FittedLaw.of(part, law, ring)
        if not fitted.faults(DESCRIBES):
            return fitted
    return None


def _spread(points: Points, candidates: Candidates, owner: Indices) -> Vector:
    shape = np.sqrt(_noise(points, candidates, owner) / candidates.cost)
    shape[candidates.have == 0] = 0.0
    return filled(shape, candidates.cost, candidates.have, candidates.most, candidates.spent)


def _noise(points: Points, candidates: Candidates, owner: Indices) -> Vector:
    measured = points.error**2 * candidates.have[owner]
    return smooth_variance(points.sizes, points.x, measured, candidates.size, candidates.x)


def _plan(points: Points, fitted: FittedLaw, candidates: Candidates, owner: Indices, coefficient: str) -> Plan:
    smallest = fitted.points.x.min()
    kept = owner[points.x >= smallest]
    usable = (candidates.x >= smallest) | np.isin(np.arange(len(candidates)), kept)
    one_each = len(set(owner.tolist())) == len(owner)
    if not one_each:
        usable &= candidates.have > 0  # what positions a new ensemble has is not known here
    noise = _noise(points, candidates, owner)
    information = _information(fitted, candidates, kept, noise, usable)
    form = np.where(usable & (candidates.have > 0), np.sqrt(noise / candidates.cost), 0.0)
    return Plan(candidates, information, (information,), _number(fitted, coefficient), usable, usable, form)


def _information(fitted: FittedLaw, candidates: Candidates, kept: Indices, noise: Vector, usable: Mask) -> Informations:
    """Of one trajectory at every place [n, m, m]: as measured where there are points, else by the smooth variance."""
    size = len(fitted.solution.theta) + len(fitted.solution.coefficients)
    information = np.zeros((len(candidates), size, size))
    for place in set(kept.tolist()):
        rows = fitted.solution.jacobian[kept == place]
        information[place] = rows.T @ rows / candidates.have[place]
    fresh = np.flatnonzero(usable & (candidates.have == 0))
    if len(fresh):
        slopes = gradients(fitted.solution, lambda solution: _predicted(fitted, solution, candidates.x[fresh]))
        information[fresh] = slopes[:, :, None] * slopes[:, None, :] / noise[fresh][:, None, None]
    return information


def _predicted(fitted: FittedLaw, solution: Solution, x: Vector) -> Vector:
    return FittedLaw(fitted.points, fitted.law, fitted.ring, solution, fitted.goodness).predicted(x)


def _number(fitted: FittedLaw, coefficient: str) -> int:
    """Which parameter of the fit the coefficient is, the exponent first; that of log2 x goes with that of ln x."""
    free, names = len(fitted.solution.theta), fitted.law.coefficients
    if fitted.law.exponent and coefficient == fitted.law.exponent.name:
        return 0
    return free + names.index(coefficient if coefficient in names else fitted.law.logarithm or "")
