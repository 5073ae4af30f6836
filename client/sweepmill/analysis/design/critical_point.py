"""Judging a critical point and saying where the next round of trajectories shrinks its error most."""

import math
from collections.abc import Sequence
from dataclasses import replace

import numpy as np

from sweepmill.analysis.arrays import Mask, Vector
from sweepmill.analysis.collapse import Collapse, fit_collapse
from sweepmill.analysis.design.allocation import Informations
from sweepmill.analysis.design.form_test import form_places
from sweepmill.analysis.design.linear import gradients
from sweepmill.analysis.design.noise import place_variance
from sweepmill.analysis.design.ordering import Bracket, bracket
from sweepmill.analysis.design.place import Advice, Candidates, Place
from sweepmill.analysis.design.rounds import Plan
from sweepmill.analysis.design.spread import spread_out
from sweepmill.analysis.design.verdict import improved, met, told
from sweepmill.analysis.design.window import Choice, choose
from sweepmill.analysis.estimate import Estimate
from sweepmill.analysis.points import Points
from sweepmill.analysis.separable import Solution
from sweepmill.analysis.shapes import Polynomial

_RICHER = 2  # degrees: trajectories are placed as if the function could be that much richer than the one fitted
_INNER = 0.5  # of the window
_NO_CHANGE = "the sizes are not seen to change their order"  # any smooth data have some collapse beside the transition
_TWO = "two sizes cannot show whether p_c moves with the size"
_UNTESTED = "the smaller sizes have no scaling that would show how p_c moves with the size"
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
    judged = _judged(collapse)
    estimate = _with_drift(judged, points, collapse.points.distinct_sizes())
    if not order:
        estimate = replace(estimate, withheld=_NO_CHANGE)
    done = met(estimate, "p_c", candidates, below) or _limited(estimate, judged, candidates, below)
    advice = done or improved(estimate, "p_c", candidates, _plan(candidates, points, choice), below)
    few = len(points.distinct_sizes()) == 2
    return replace(advice, reason=f"{advice.reason}; {_TWO}") if few else advice


def _limited(estimate: Estimate, judged: Estimate, candidates: Candidates, below: float) -> Advice | None:
    """The end where p_c moves with the size by more than is asked: trajectories do not cure that."""
    drift = math.sqrt(max(0.0, estimate.spread**2 - judged.spread**2))
    if estimate.error is None or drift <= 2 * below or estimate.statistical > below / 2:
        return None
    why = f"p_c = {estimate}: it moves with the size by more than {below:g}; larger sizes would help, not trajectories"
    return Advice(estimate, False, tuple(int(number) for number in candidates.have), estimate.error, why)


def _with_drift(estimate: Estimate, points: Points, used: list[float]) -> Estimate:
    """Where two of more sizes are left, nothing in their fit shows how p_c moves with the size.

    The pair before them does: the whole way from its p_c counts as spread.
    """
    sizes = points.distinct_sizes()
    if len(used) > 2 or len(sizes) == 2:
        return estimate
    before = choose(points.taken(np.isin(points.sizes, sizes[-3:-1])))
    if before is None:
        return replace(estimate, withheld=_UNTESTED)
    return replace(estimate, spread=math.hypot(estimate.spread, estimate.value - float(before.fitted.values[0])))


def _judged(collapse: Collapse) -> Estimate:
    """p_c with the larger of two errors by noise: that of the folds, and that by linear propagation.

    The first fluctuates by a tenth from round to round, and rounds end when it is small; the second does not.
    """
    estimate, goodness = collapse["p_c"], collapse.goodness
    linear = math.sqrt(collapse.fitted.solution.covariance[0, 0] * max(1.0, goodness.ratio))
    return replace(estimate, statistical=max(estimate.statistical, linear))


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
    where = f"between {order.low:g} and {order.high:g}" if order else "over the whole range"
    targets = spread_out(candidates, points, order)
    return told(estimate, targets, math.nan, f"{trouble}: values are spread {where}", candidates)


def _plan(candidates: Candidates, points: Points, choice: Choice) -> Plan:
    fitted = choice.fitted
    used = fitted.points.distinct_sizes()
    u = fitted.frame.scaled(fitted.solution.theta, candidates.x, candidates.size)
    usable = (np.abs(u) <= choice.reach * (1 + 1e-9)) & np.isin(candidates.size, used)
    noise = place_variance(candidates, points, u)
    form = form_places(candidates, u, choice.reach, np.array(used)) * np.sqrt(noise / candidates.cost)
    information, cautious = (_information(choice, candidates, noise, richer) for richer in (0, _RICHER))
    fits = _with_and_without_smallest(cautious, candidates, used)
    return Plan(candidates, information, fits, 0, usable, usable & _inner(candidates, u, choice.reach), form)


def _with_and_without_smallest(
    information: Informations, candidates: Candidates, sizes: list[float]
) -> tuple[Informations, ...]:
    """With three sizes or more p_c is wanted without the smallest, too: only that shows corrections to scaling."""
    if len(sizes) < 3:
        return (information,)
    return information, np.where((candidates.size > sizes[0])[:, None, None], information, 0.0)


def _inner(candidates: Candidates, u: Vector, reach: float) -> Mask:
    """The inner half of the window, and the two places of every size nearest to p_c; all where those are full.

    At the edges a polynomial is worst, and a small variance there would draw trajectories to where the form breaks.
    """
    inner = np.abs(u) <= _INNER * reach
    for size in np.unique(candidates.size):
        of = np.flatnonzero(candidates.size == size)
        inner[of[np.argsort(np.abs(u[of]), kind="stable")[:2]]] = True
    room = (candidates.most > candidates.have) & (np.abs(u) <= reach)
    return inner if (room & inner).any() else np.ones_like(inner)


def _information(choice: Choice, candidates: Candidates, noise: Vector, richer: int) -> Informations:
    """Of one trajectory at every place, p_c first; for the form as fitted or with a polynomial of higher degree."""
    frame = choice.fitted.frame

    def predicted(solution: Solution) -> Vector:
        design = frame.design_at(solution.theta, candidates.x, candidates.size)
        return np.asarray(design @ solution.coefficients)

    solution, shape = choice.fitted.solution, frame.form.shape
    form = replace(frame.form, shape=Polynomial(shape.coefficients - 1 + richer))
    design = replace(frame, form=form).design_at(solution.theta, candidates.x, candidates.size)
    slopes = np.hstack([gradients(solution, predicted)[:, : len(solution.theta)], design])
    return np.asarray(slopes[:, :, None] * slopes[:, None, :] / noise[:, None, None])
