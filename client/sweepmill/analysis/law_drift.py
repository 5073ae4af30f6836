"""How the parameters of a law move with the window of x, and the running slope of a logarithm."""

import math
from dataclasses import dataclass

import numpy as np

from sweepmill.analysis.drift import Row, drift_row
from sweepmill.analysis.estimate import with_error
from sweepmill.analysis.jackknife import jackknife_error
from sweepmill.analysis.law_fit import FittedLaw
from sweepmill.analysis.laws import chord_length
from sweepmill.analysis.points import Points

_CUTS, _SLOPES = 4, 6  # windows looked at, slopes shown


@dataclass(frozen=True)
class LogSlope:
    """(S_2 - S_1) / ln(x_2/x_1) between two places, with its standard error."""

    low: float
    high: float
    slope: float
    error: float


def law_rows(base: FittedLaw, acceptable: float) -> tuple[Row, ...]:
    """The fit repeated without the smallest x, cut evenly among the points, as far as a degree of freedom is left."""
    order = np.sort(base.points.x)
    most = len(order) - base.law.parameters - 1
    cuts = sorted({round(most * cut / _CUTS) for cut in range(1, _CUTS + 1)} - {0}) if most > 0 else []
    rows = []
    for cut in cuts:
        part = base.points.taken(base.points.x >= order[cut])
        if len(part) > base.law.parameters:
            varied = FittedLaw.of(part, base.law, base.ring, base.exponent)
            rows.append(drift_row("window", f"x >= {order[cut]:g}", base, varied, acceptable))
    return tuple(rows)


def log_slopes(points: Points, ring: float | None = None) -> tuple[LogSlope, ...]:
    """Slopes by ln x over neighboring doublings of x (or the nearest there is); chords on a ring."""
    order = np.argsort(points.x)
    r = chord_length(points.x, ring)
    found: list[LogSlope] = []
    first = 0
    while first < len(order) - 1:
        later = [j for j in range(first + 1, len(order)) if r[order[j]] >= 1.999 * r[order[first]]]
        second = later[0] if later else len(order) - 1
        if r[order[second]] > r[order[first]] and (later or not found):
            found.append(
                _slope(points, int(order[first]), int(order[second]), float(r[order[second]] / r[order[first]]))
            )
        first = second
    return tuple(found)


def _slope(points: Points, i: int, j: int, ratio: float) -> LogSlope:
    width, error = math.log(ratio), math.hypot(points.error[i], points.error[j])
    if points.replicas is not None and points.keys[i] == points.keys[j]:
        error = float(jackknife_error(points.replicas[:, [j]] - points.replicas[:, [i]])[0])
    slope = float(points.mean[j] - points.mean[i]) / width
    return LogSlope(float(points.x[i]), float(points.x[j]), slope, error / width)


def slopes_text(slopes: tuple[LogSlope, ...]) -> str:
    """How the slope by ln x runs between neighboring points."""
    run = ", ".join(f"{with_error(s.slope, s.error)} ({s.low:g} to {s.high:g})" for s in slopes[-_SLOPES:])
    return f"Slope by ln x: {run}."


def window_text(fitted: FittedLaw, rows: tuple[Row, ...]) -> str:
    """How the coefficient of the logarithm runs when small x are left out."""
    name = fitted.law.logarithm or ""
    shown = [f"{with_error(row.values[name], row.errors[name])} ({row.what})" for row in rows if row.accepted]
    return f"{name} of {fitted.law.formula} in windows: {', '.join(shown) or 'too few points to look'}."
