"""Variations of a collapse: without the smallest sizes, without far points, with other shapes of the function."""

from collections.abc import Iterator
from dataclasses import replace

import numpy as np

from sweepmill.analysis.drift import Row, drift_row
from sweepmill.analysis.fitted import Fitted
from sweepmill.analysis.points import Points
from sweepmill.analysis.scaling import Scaling

NEAR = (0.75, 0.5)  # shares of the largest |u| that are kept when far points are dropped


def drift_rows(base: Fitted, acceptable: float) -> tuple[Row, ...]:
    """The fit repeated without the smallest sizes, without far points, and with other shapes."""
    rows, starts = [], None if base.faults(acceptable) else [base.solution.theta]
    for kind, what, points, form in _variations(base):
        if len(points) <= form.parameters() or len(points.distinct_sizes()) < 2:
            continue
        varied = Fitted.of(points, form, starts)
        rows.append(drift_row(kind, what, base, varied, acceptable))
    return tuple(rows)


def _variations(base: Fitted) -> Iterator[tuple[str, str, Points, Scaling]]:
    points, form = base.points, base.frame.form
    for smallest in points.distinct_sizes()[1:-1]:
        yield "sizes", f"L >= {smallest:g}", points.taken(points.sizes >= smallest), form
    u = np.abs(base.frame.scaled(base.solution.theta, points.x, points.sizes))
    for share in NEAR:
        yield "window", f"|u| <= {share * u.max():.3g}", points.taken(u <= share * u.max()), form
    for shape in form.shape.varied():
        yield "shape", str(shape), points, replace(form, shape=shape)
