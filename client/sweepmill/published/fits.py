"""Ours beside the published: runs the fit that a published result asks for on the folds of its sweep."""

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from sweepmill.analysis import (
    DECAY,
    ENTANGLEMENT,
    GROWTH,
    TIMES,
    Estimate,
    Points,
    Polynomial,
    Scaling,
    fit_central_charge,
    fit_collapse,
    fit_crossings,
    fit_laws,
    purification_times,
    replicas_from_folds,
)
from sweepmill.analysis.selecting import keys_of, numbers
from sweepmill.folds import Folds
from sweepmill.published.averages import average
from sweepmill.published.models import (
    AveragesFit,
    CollapseFit,
    CrossingsFit,
    Fit,
    LawFit,
    RecordFit,
)
from sweepmill.table import Table

LAWS = {"entanglement": ENTANGLEMENT, "growth": GROWTH, "decay": DECAY, "times": TIMES}
Draw = Callable[[Path], Any]
OnPoints = CollapseFit | CrossingsFit | LawFit | RecordFit


@dataclass(frozen=True)
class Outcome:
    """What a fit gave: what it says of itself, estimates by quantity, and how to draw it (None: there is no figure)."""

    text: str
    estimates: dict[str, Estimate]
    draw: Draw | None = None


def fitted(fit: Fit, folds: Folds, histograms: Table) -> Outcome:
    """The outcome of a fit on the folds and histograms of its sweep. Raises ValueError where they do not suffice."""
    if isinstance(fit, AveragesFit):
        estimates = {one.quantity: average(one, folds, histograms) for one in fit.averages}
        return Outcome(f"{len(estimates)} averages, without a fit.", estimates)
    outcome = _on_points(fit, points_of(fit, folds))
    named = {fit.quantities.get(name, name): one for name, one in outcome.estimates.items()}
    return Outcome(outcome.text, named, outcome.draw)


def _on_points(fit: OnPoints, points: Points) -> Outcome:
    match fit:
        case CollapseFit():
            form = Scaling(Polynomial(fit.degree), corrected=fit.corrected, omega=fit.omega)
            collapse = fit_collapse(points, form)
            return Outcome(str(collapse), collapse.estimates, lambda path: collapse.plot(path, fit.x, fit.name or ""))
        case CrossingsFit():
            crossings = fit_crossings(points, fit.degree, fit.power)
            text = f"{crossings}\n{crossings.text()}"
            return Outcome(text, crossings.estimates, lambda path: crossings.plot(path, fit.x, fit.name or ""))
        case RecordFit():
            charge = fit_central_charge(points, fit.rate)
            return Outcome(f"{charge}\n{charge.drift_text()}", {"c_eff": charge.c_eff, "f": charge.outcome_randomness})
        case LawFit():
            return _law(fit, points)


def _law(fit: LawFit, points: Points) -> Outcome:
    curve = points if fit.threshold is None else purification_times(points, fit.threshold)
    curve = curve if fit.points is None else curve.thinned(fit.points)
    comparison = fit_laws(curve, LAWS[fit.among], fit.ring)
    estimates = dict(comparison[fit.law].estimates)
    if fit.slopes:
        estimates |= {f"slope {s.low:g} to {s.high:g}": Estimate(s.slope, s.error) for s in comparison.slopes}
    return Outcome(str(comparison), estimates, lambda path: comparison.plot(path, fit.x, fit.name or ""))


def points_of(fit: OnPoints, folds: Folds) -> Points:
    """The points of a fit, with replicas."""
    rows = folds.where(**fit.where) if fit.where else folds
    if fit.places:
        points = _by_name(rows.where(name=list(fit.places)), fit.places)
    else:
        points = Points.from_folds(rows.where(name=fit.name) if fit.name else rows, fit.x)
    near, keep = fit.near, np.ones(len(points), dtype=bool)
    if near.sizes:
        keep &= np.isin(points.sizes, near.sizes)
    if near.reach is not None:
        keep &= np.abs(points.x - near.center) * points.sizes**near.power <= near.reach * (1 + 1e-9)
    if near.at_least is not None:
        keep &= points.x >= near.at_least
    return points.taken(keep)


def _by_name(folds: Folds, places: dict[str, float]) -> Points:
    """Points of several observations of the same ensembles, each at its own x."""
    x = [places[name] for name in folds.values("name")]
    replicas = replicas_from_folds(*folds.sums())
    return Points.of(numbers(folds, "sites"), x, folds["mean"], folds["standard_error"], replicas, keys_of(folds))
