"""The figure of mean purities: they themselves, and the entropies -log2 of them."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from sweepmill.analysis.plot import GRAY, dots, inks, saved, sheet
from sweepmill.analysis.purities import Purities

if TYPE_CHECKING:
    from matplotlib.figure import Figure


def plot_purities(result: Purities, path: str | Path | None, x_label: str, y_label: str) -> Figure:
    """Two panels; purities without an error bar are drawn as gray crosses."""
    with sheet(str(result), rows=1) as (figure, (purities, entropies)):
        points, sizes = result.points, result.points.distinct_sizes()
        values = np.array([one.estimate.value for one in result.averages])
        errors = np.array([one.estimate.statistical for one in result.averages])
        open_ones = np.array([bool(one.estimate.withheld) for one in result.averages])
        for index, (size, color) in enumerate(zip(sizes, inks(len(sizes)), strict=True)):
            of = (points.sizes == size) & ~open_ones
            for axes, y, error in ((purities, values, errors), (entropies, points.mean, points.error)):
                dots(axes, points.x[of], y[of], error[of], color, index, f"L = {size:g}")
                axes.plot(*np.stack([points.x, y])[:, of], color=color, lw=0.6)
        for axes, y in ((purities, values), (entropies, points.mean)):
            axes.plot(points.x[open_ones], y[open_ones], "x", color=GRAY, ms=4)
        purities.set(xlabel=x_label, ylabel=f"mean of 2^-S, S = {y_label}", title="mean purity", yscale="log")
        entropies.set(xlabel=x_label, ylabel="bits", title="-log2 of the mean purity")
        entropies.legend(frameon=False)
    return saved(figure, path)
