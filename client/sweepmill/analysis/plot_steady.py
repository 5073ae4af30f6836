"""The figure of a verdict on steadiness: the series, and the change between their last quarters."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from sweepmill.analysis.plot import GRAY, inks, saved, sheet
from sweepmill.analysis.steady import Steadiness

if TYPE_CHECKING:
    from matplotlib.figure import Figure

_COLORS = {"steady": "#5f8a5b", "too noisy to tell": GRAY, "still changing": "#a8442a"}
_MOST_NAMED = 24


def plot_steady(result: Steadiness, path: str | Path | None, x_label: str, y_label: str) -> Figure:
    """Two panels: every series over its share of the layers, and its change in units of its error, by verdict."""
    with sheet(result.summary(), rows=1) as (figure, (series, changes)):
        sizes = sorted({row.size for row in result.rows})
        colors = dict(zip(sizes, inks(len(sizes)), strict=True))
        seen: set[float] = set()
        for row, curve in zip(result.rows, result.series, strict=True):
            order = np.argsort(curve.x)
            label = None if row.size in seen else f"L = {row.size:g}"
            series.plot(curve.x[order] / row.layers, curve.mean[order], color=colors[row.size], lw=0.9, label=label)
            seen.add(row.size)
        series.axvspan(0.5, 0.75, color=GRAY, alpha=0.10, lw=0)
        series.axvspan(0.75, 1.0, color=GRAY, alpha=0.22, lw=0)
        series.set(xlabel=f"share of the {x_label}s", ylabel=y_label, title="series, third and fourth quarter shaded")
        series.legend(framealpha=0.85, edgecolor="none")
        for place, row in enumerate(result.rows):
            bar = [2 * row.error / row.scale]
            at = [row.change / row.scale]
            changes.errorbar(at, [place], xerr=bar, marker="o", ms=4, color=_COLORS[row.verdict])
        changes.axvspan(-result.tolerance, result.tolerance, color=GRAY, alpha=0.12, lw=0)
        changes.axvline(0, color=GRAY, lw=0.8)
        if len(result.rows) <= _MOST_NAMED:
            changes.set_yticks(range(len(result.rows)), [row.label or f"L = {row.size:g}" for row in result.rows])
        changes.invert_yaxis()
        changes.locator_params(axis="x", nbins=5)
        title = "change from third to fourth quarter\n(bars: two errors; shaded: would not matter)"
        changes.set(xlabel="change / mean", title=title)
    return saved(figure, path)
