"""Stored totals as the points that an analysis takes."""

from collections.abc import Sequence
from typing import Any

import numpy as np

from sweepmill.accumulate import Accumulator
from sweepmill.analysis import Points, replicas_from_folds
from sweepmill.coordinates import coordinates
from sweepmill.ensemble import Ensemble
from sweepmill.folds import fold_ratios
from sweepmill.statistics import summarize
from sweepmill_service.store.rounds import StoredPlace


def points_of(places: Sequence[StoredPlace], observed: Any, sizes: Sequence[float], x: Sequence[float]) -> Points:
    """One point per place that was sampled, with its replicas; sizes and x by place."""
    totals = [Accumulator.from_bytes(place.accumulator or b"") for place in places]
    where = [coordinates(Ensemble.from_normal_form(place.normal_form), observed) for place in places]
    moments = [summarize(total, at)[0] for total, at in zip(totals, where, strict=True)]
    folds = [fold_ratios(total, at) for total, at in zip(totals, where, strict=True)]
    replicas = [replicas_from_folds(numerators, denominators)[:, :1] for numerators, denominators in folds]
    means, errors = [one.mean for one in moments], [one.standard_error for one in moments]
    return Points.of(sizes, x, means, errors, np.hstack(replicas), [place.ensemble for place in places])


def curve_of(place: StoredPlace, observed: Any) -> tuple[Points, float | None]:
    """The points of one place, x its positions, and the ring whose chords stand for lengths, if any.

    Positions go up to half the chain: beyond it the same cuts come again from the other end. On an open chain a cut
    at l goes by (2 L/pi) sin(pi l/L) (Entanglement entropy and quantum field theory, J. Stat. Mech. P06002 (2004),
    from memory), the chord on a ring of L sites but for a factor, which a constant takes up; a window inside it has
    no such length.
    """
    ensemble, total = Ensemble.from_normal_form(place.normal_form), Accumulator.from_bytes(place.accumulator or b"")
    at = coordinates(ensemble, observed)
    moments = summarize(total, at)
    replicas = replicas_from_folds(*fold_ratios(total, at))
    positions = [float(one.position or 0) for one in at]
    means, errors = [one.mean for one in moments], [one.standard_error for one in moments]
    points = Points.of(ensemble.sites, positions, means, errors, replicas, [place.ensemble] * len(at))
    chords = ensemble.periodic or getattr(observed, "region", None) == "every-cut"
    return points.taken(points.x <= ensemble.sites / 2), float(ensemble.sites) if chords else None
