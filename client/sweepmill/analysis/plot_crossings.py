"""The figure of crossings: the curves near them, and the crossings against the power of the size."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from sweepmill.analysis.crossings import Crossings
from sweepmill.analysis.plot import GRAY, dots, inks, saved, sheet

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure


def plot_crossings(result: Crossings, path: str | Path | None, x_label: str, y_label: str) -> Figure:
    """Two panels; crossings with a fault are drawn as crosses, the extrapolation dashed where it is flagged.

    An extrapolation that nothing tests, by as many parameters as crossings, is not drawn.
    """
    with sheet(str(result), rows=1) as (figure, (data, places)):
        points, sizes = result.points, result.points.distinct_sizes()
        for index, (size, color) in enumerate(zip(sizes, inks(len(sizes)), strict=True)):
            of = np.flatnonzero(points.sizes == size)
            of = of[np.argsort(points.x[of])]
            dots(data, points.x[of], points.mean[of], points.error[of], color, index, f"L = {size:g}")
            data.plot(points.x[of], points.mean[of], color=color, lw=0.6)
        for one in result.table:
            data.axvline(one.place, color=GRAY, lw=0.5)
        data.set(xlabel=x_label, ylabel=y_label, title="data, and where neighboring sizes cross")
        data.legend(frameon=False)
        data.locator_params(axis="x", nbins=6)
        _places(places, result)
        places.ticklabel_format(axis="y", useOffset=False)
        places.set(ylabel=f"crossing in {x_label}", title="crossings against the smaller size")
    return saved(figure, path)


def _places(axes: Axes, result: Crossings) -> None:
    power = result.estimates["power"].value if "power" in result.estimates else result.power or 1.0
    for one in result.table:
        shape, color = ("x", GRAY) if one.fault else ("o", inks(3)[2])
        axes.errorbar([one.small**-power], [one.place], yerr=[one.place_error], marker=shape, ms=4, color=color)
    axes.set_xlabel(f"L^-{power:.3g}")
    if result.goodness is not None and result.goodness.dof > 0:
        p_c, amplitude = result["p_c"], result["amplitude"].value
        line = np.linspace(0.0, min(one.small for one in result.table) ** -power, 50)
        axes.plot(line, p_c.value + amplitude * line, "--" if result.flags else "-", color=GRAY, lw=0.9)
        axes.errorbar([0.0], [p_c.value], yerr=[p_c.error or 0.0], marker="D", ms=4, color=inks(3)[0])
