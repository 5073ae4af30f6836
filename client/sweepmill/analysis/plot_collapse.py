"""The figure of a collapse: data, collapse, residuals, drift."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from sweepmill.analysis.collapse import Collapse
from sweepmill.analysis.drift import first_row
from sweepmill.analysis.plot import GRAY, dots, drift_panel, inks, residual_panel, saved, sheet

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure


def plot_collapse(result: Collapse, path: str | Path | None, x_label: str, y_label: str) -> Figure:
    """Four panels; the fitted curves are drawn through the data, and dashed where the fit is flagged."""
    with sheet(str(result)) as (figure, (data, scaled, residuals, drift)):
        points, sizes = result.points, result.points.distinct_sizes()
        standardized = result.fitted.standardized()
        residual_panel(residuals, "scaling variable u")
        for index, (size, color) in enumerate(zip(sizes, inks(len(sizes)), strict=True)):
            of = points.sizes == size
            dots(data, points.x[of], points.mean[of], points.error[of], color, index, f"L = {size:g}")
            _curve(data, result, size, color)
            u, lift = _scaled(result, size)
            taken_off = points.mean[of] - result.fitted.correction(points.x[of], points.sizes[of])
            dots(scaled, u, taken_off * lift, points.error[of] * lift, color, index, f"L = {size:g}")
            residuals.scatter(u, standardized[of], s=12, color=color)
        _master(scaled, result)
        data.axvline(result["p_c"].value, color=GRAY, lw=0.8)
        data.set(xlabel=x_label, ylabel=y_label, title="data")
        data.legend(frameon=False)
        data.locator_params(axis="x", nbins=6)
        form = result.fitted.frame.form
        lifted = y_label if form.zeta == 0 else f"{y_label} L^(zeta/nu)"
        title = "collapse, corrections taken off" if form.corrected else "collapse"
        scaled.set(xlabel="scaling variable u", ylabel=lifted, title=title)
        rows = (first_row(result.fitted, result.acceptable), *result.drift)
        drift_panel(drift, rows, "p_c", (result["p_c"].value, result["p_c"].error))
    return saved(figure, path)


def _curve(axes: Axes, result: Collapse, size: float, color: str) -> None:
    x = result.points.x[result.points.sizes == size]
    fine = np.linspace(x.min(), x.max(), 120)
    style = "--" if result.flags else "-"
    axes.plot(fine, result.fitted.predicted(fine, np.full_like(fine, size)), style, color=color, lw=1.0)


def _master(axes: Axes, result: Collapse) -> None:
    """The scaling function, drawn through the size whose points reach furthest in u."""
    furthest = max(result.points.distinct_sizes(), key=lambda size: float(np.ptp(_scaled(result, size)[0])))
    x = result.points.x[result.points.sizes == furthest]
    fine, (_, lift) = np.linspace(x.min(), x.max(), 120), _scaled(result, furthest)
    sizes = np.full_like(fine, furthest)
    u = result.fitted.frame.scaled(result.fitted.solution.theta, fine, sizes)
    leading = result.fitted.predicted(fine, sizes) - result.fitted.correction(fine, sizes)
    axes.plot(u, leading * lift, color=GRAY, lw=0.9, zorder=0)


def _scaled(result: Collapse, size: float) -> tuple[np.ndarray, float]:
    frame, theta, points = result.fitted.frame, result.fitted.solution.theta, result.points
    of = points.sizes == size
    return frame.scaled(theta, points.x[of], points.sizes[of]), size ** frame.values(theta)["zeta_over_nu"]
