"""The figure of a model-free collapse: data, collapse, distances from the other sizes, drift with the window."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from sweepmill.analysis.measures import deviations
from sweepmill.analysis.model_free import ModelFree
from sweepmill.analysis.plot import GRAY, dots, estimates_panel, inks, residual_panel, saved, sheet

if TYPE_CHECKING:
    from matplotlib.figure import Figure


def plot_model_free(result: ModelFree, path: str | Path | None, x_label: str, y_label: str) -> Figure:
    """Four panels; lines join neighboring points of a size, as the measure of collapse does."""
    with sheet(str(result)) as (figure, (data, scaled, residuals, drift)):
        points, sizes = result.points, result.points.distinct_sizes()
        u, lift = result.scaled()
        away = deviations(u, points.mean * lift, points.error * lift, points.sizes)
        residual_panel(residuals, "scaling variable u")
        for index, (size, color) in enumerate(zip(sizes, inks(len(sizes)), strict=True)):
            of = np.flatnonzero(points.sizes == size)
            of = of[np.argsort(points.x[of])]
            dots(data, points.x[of], points.mean[of], points.error[of], color, index, f"L = {size:g}")
            data.plot(points.x[of], points.mean[of], color=color, lw=0.6)
            dots(scaled, u[of], points.mean[of] * lift[of], points.error[of] * lift[of], color, index, f"L = {size:g}")
            scaled.plot(u[of], points.mean[of] * lift[of], color=color, lw=0.6)
            residuals.scatter(u[of], away[of], s=12, color=color)
        data.axvline(result["p_c"].value, color=GRAY, lw=0.8)
        data.set(xlabel=x_label, ylabel=y_label, title="data")
        data.locator_params(axis="x", nbins=6)
        data.legend(frameon=False)
        lifted = f"{y_label} L^(zeta/nu)" if "zeta" in result.estimates else y_label
        scaled.set(xlabel="scaling variable u", ylabel=lifted, title="collapse")
        residuals.set(ylabel="(data - other sizes) / error", title="distance from a line through the other sizes")
        rows = [(one.what, one.values["p_c"], float(one.errors[0])) for one in result.windows]
        estimates_panel(drift, [("all", result["p_c"].value, result["p_c"].error), *rows], "p_c")
    return saved(figure, path)
