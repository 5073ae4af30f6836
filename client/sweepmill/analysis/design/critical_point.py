"""Judging a critical point and saying where the next round of trajectories shrinks its error most."""

import math
from collections.abc import Sequence

import numpy as np

from sweepmill.analysis.arrays import Matrix, Vector
from sweepmill.analysis.collapse import Collapse, fit_collapse
from sweepmill.analysis.design.form_test import form_places
from sweepmill.analysis.design.linear import gradients
from sweepmill.analysis.design.noise import smooth_variance
from sweepmill.analysis.design.ordering import Bracket, bracket
from sweepmill.analysis.design.place import Advice, Candidates, Place
from sweepmill.analysis.design.rounds import AIM, Plan
from sweepmill.analysis.design.spread import spread_out
from sweepmill.analysis.design.window import Choice, choose
from sweepmill.analysis.estimate import Estimate
from sweepmill.analysis.points import Points
from sweepmill.analysis.separable import Solution

_ROUGH = 0.25  # of the range of x: a fit with a larger error does not tell where to look


def advise_critical_point(points: Points, places: Sequence[Place], below: float) -> Advice:
    """The critical point by finite-size collapse, and the trajectories every place should have after the next round.

    `points` are the places with trajectories, in their order. Rounds at most double the core-seconds. Raises
    ValueError if points and places do not fit together or there are fewer than two sizes.
    """
    candidates = _checked(points, places)
    order, choice = bracket(points), choose(points)
    trouble = _trouble(points, choice, order)
    if choice is None or trouble:
        return _without_fit(candidates, points, order, choice, trouble)
    collapse = fit_collapse(choice.fitted.points, choice.fitted.frame.form)
    estimate = collapse["p_c"]
    if estimate.error is not None and estimate.error <= below:
        return _advice(estimate, True, candidates.have, estimate.error, f"p_c = {estimate} is as precise as asked")
    return _improved(candidates, points, choice, collapse, below)


def _checked(points: Points, places: Sequence[Place]) -> Candidates:
    candidates = Candidates.of(places)
    placed = candidates.have > 0
    same = placed.sum() == len(points) and np.array_equal(candidates.size[placed], points.sizes)
    if not same or not np.allclose(candidates.x[placed], points.x):
        raise ValueError("the points must be the places that have trajectories, in their order")
    if len(points.distinct_sizes()) < 2:
        raise ValueError("a critical point needs at least two sizes")
    return candidates


def _trouble(points: Points, choice: Choice | None, order: Bracket | None) -> str:
    """Why the fit does not tell where the transition is; empty where it does."""
    if choice is None:
        return "no choice of sizes and window is described by the scaling form"
    p_c, error = choice.fitted.values[0], math.sqrt(choice.fitted.variances[0])
    if error > _ROUGH * float(np.ptp(points.x)):
        return "the fit does not fix p_c yet"
    if order and not order.low - 3 * error - order.width <= p_c <= order.high + 3 * error + order.width:
        return f"the fit has p_c = {p_c:.4g}, but the sizes change order between {order.low:g} and {order.high:g}"
    return ""


def _without_fit(
    candidates: Candidates, points: Points, order: Bracket | None, choice: Choice | None, trouble: str
) -> Advice:
    value = math.nan if choice is None else float(choice.fitted.values[0])
    estimate = Estimate(value, math.nan, 0.0, trouble)
    targets = spread_out(candidates, points, order)
    where = f"between {order.low:g} and {order.high:g}" if order else "over the whole range"
    return _advice(estimate, False, targets, math.nan, f"{trouble}: values are spread {where}", candidates)


def _improved(candidates: Candidates, points: Points, choice: Choice, collapse: Collapse, below: float) -> Advice:
    estimate = collapse["p_c"]
    plan = _plan(candidates, points, choice)
    error = math.hypot(estimate.statistical, estimate.spread)
    targets = _whole(plan.round((AIM * below / error) ** 2), candidates)
    shrink = plan.variance(targets) / plan.variance(candidates.have)
    predicted = error * math.sqrt(shrink)
    why = f"p_c = {estimate}, {below:g} is asked"
    return _advice(estimate, False, targets, predicted, why, candidates)


def _plan(candidates: Candidates, points: Points, choice: Choice) -> Plan:
    fitted = choice.fitted
    used = fitted.points.distinct_sizes()
    u = fitted.frame.scaled(fitted.solution.theta, candidates.x, candidates.size)
    usable = (np.abs(u) <= choice.reach * (1 + 1e-9)) & np.isin(candidates.size, used)
    noise = _noise(candidates, points)
    slopes = _slopes(choice, candidates)
    information = slopes[:, :, None] * slopes[:, None, :] / noise[:, None, None]
    form = form_places(candidates, u, choice.reach, np.array(used)) * np.sqrt(noise / candidates.cost)
    direction = np.zeros(slopes.shape[1])
    direction[0] = 1.0
    return Plan(candidates, information, direction, usable, form)


def _slopes(choice: Choice, candidates: Candidates) -> Matrix:
    frame = choice.fitted.frame

    def predicted(solution: Solution) -> Vector:
        design = frame.design_at(solution.theta, candidates.x, candidates.size)
        return np.asarray(design @ solution.coefficients)

    return gradients(choice.fitted.solution, predicted)


def _noise(candidates: Candidates, points: Points) -> Vector:
    placed = candidates.have > 0
    measured = candidates.have[placed] * points.error**2
    return smooth_variance(points.sizes, points.x, measured, candidates.size, candidates.x)


def _whole(targets: Vector, candidates: Candidates) -> Vector:
    return np.minimum(np.maximum(np.ceil(targets - 1e-6), candidates.have), candidates.most)


def _advice(
    estimate: Estimate, met: bool, targets: Vector, predicted: float, reason: str, candidates: Candidates | None = None
) -> Advice:
    if candidates is not None:
        targets = _whole(targets, candidates)
        if (targets <= candidates.have).all():
            reason += "; every ensemble that could help has all the trajectories it may have"
    return Advice(estimate, met, tuple(int(one) for one in targets), predicted, reason)
