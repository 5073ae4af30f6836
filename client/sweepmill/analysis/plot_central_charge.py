"""The figure of a record free energy: data against 1/L^2, residuals, drift of c_eff."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from sweepmill.analysis.drift import first_row
from sweepmill.analysis.free_energy import CentralCharge
from sweepmill.analysis.goodness import ACCEPTABLE
from sweepmill.analysis.plot import GRAY, dots, doublings, drift_panel, inks, residual_panel, saved, sheet

if TYPE_CHECKING:
    from matplotlib.figure import Figure


def plot_central_charge(result: CentralCharge, path: str | Path | None, x_label: str, y_label: str) -> Figure:
    """Four panels; the fitted line is dashed where the fit is flagged, and goes on to infinite size."""
    with sheet(str(result)) as (figure, (plain, straight, residuals, drift)):
        fitted, points = result.fitted, result.fitted.points
        style, fine = "--" if result.flags else "-", np.geomspace(points.x.min(), 64 * points.x.max(), 400)
        dots(plain, points.x, points.mean, points.error, inks(3)[2], 0, "data")
        inside = fine <= points.x.max()
        plain.plot(fine[inside], fitted.predicted(fine[inside]), style, color=GRAY, lw=1.0)
        plain.axhline(result.outcome_randomness.value, color=GRAY, lw=0.8, ls=":")
        doublings(plain)
        plain.set(xlabel=x_label, ylabel=y_label, title="data, and the limit of infinite size (dotted)")
        dots(straight, points.x**-2.0, points.mean, points.error, inks(3)[2], 0, "data")
        straight.plot(fine**-2.0, fitted.predicted(fine), style, color=GRAY, lw=1.0)
        straight.set(xlabel=f"1/{x_label}^2", ylabel=y_label, title="against 1/L^2: the slope gives c_eff")
        residual_panel(residuals, x_label)
        doublings(residuals)
        residuals.scatter(points.x, (points.mean - fitted.predicted(points.x)) / points.error, s=14, color=inks(3)[2])
        rows = (first_row(fitted, ACCEPTABLE), *result.drift)
        slope = fitted.values[fitted.names.index("B")]
        factor = abs(slope / result.c_eff.value) if result.c_eff.value else 1.0
        error = None if result.c_eff.error is None else factor * result.c_eff.error
        drift_panel(drift, rows, "B", (float(slope), error))
    return saved(figure, path)
