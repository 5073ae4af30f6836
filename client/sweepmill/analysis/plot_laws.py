"""The figure of a comparison of laws: data in plain and logarithmic x, residuals, drift of the best law."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from sweepmill.analysis.compare import Candidate, Comparison
from sweepmill.analysis.drift import first_row
from sweepmill.analysis.goodness import ACCEPTABLE
from sweepmill.analysis.plot import dots, doublings, drift_panel, inks, residual_panel, saved, sheet

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

_SHOWN = 3


def plot_laws(result: Comparison, path: str | Path | None, x_label: str, y_label: str) -> Figure:
    """Four panels; the heaviest laws are drawn, dashed where they do not describe the data."""
    with sheet(str(result)) as (figure, (plain, logarithmic, residuals, drift)):
        points = result.points
        shown = sorted(result.candidates, key=lambda one: one is not result.shown)[:_SHOWN]
        residual_panel(residuals, x_label)
        doublings(residuals)
        doublings(logarithmic)
        for axes in (plain, logarithmic):
            dots(axes, points.x, points.mean, points.error, "#333333", 0, "data")
        fine = np.geomspace(points.x.min(), points.x.max(), 200)
        for index, (one, color) in enumerate(zip(shown, inks(len(shown)), strict=True)):
            for axes in (plain, logarithmic):
                style = "--" if one.faults else "-"
                axes.plot(fine, one.fitted.predicted(fine), style, color=color, lw=1.0, label=one.fitted.law.formula)
            off = (points.mean - one.fitted.predicted(points.x)) / points.error
            residuals.plot(points.x, np.clip(off, -6, 6), "os^"[index], ms=3.5, color=color)
        plain.set(xlabel=x_label, ylabel=y_label, title="data and the heaviest laws")
        plain.legend(frameon=False)
        logarithmic.set(xlabel=x_label, ylabel=y_label, title="the same in logarithmic scale")
        _drift(drift, result.shown)
    return saved(figure, path)


def _drift(axes: Axes, best: Candidate) -> None:
    name = best.fitted.law.logarithm or (
        best.fitted.law.exponent.name if best.fitted.law.exponent else best.fitted.names[0]
    )
    rows = (first_row(best.fitted, ACCEPTABLE), *best.drift)
    drift_panel(axes, rows, name, (best[name].value, best[name].error))
