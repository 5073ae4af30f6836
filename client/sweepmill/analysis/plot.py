"""The common look of the figures of this package."""

from collections.abc import Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path

import numpy as np

from sweepmill.analysis.arrays import Vector
from sweepmill.analysis.drift import Row
from sweepmill.extras import needing

with needing("plot()", "analysis"):
    import matplotlib as mpl
    from matplotlib.axes import Axes
    from matplotlib.colors import LinearSegmentedColormap, to_hex
    from matplotlib.figure import Figure
    from matplotlib.ticker import FuncFormatter

_INKS = ("#c8963e", "#5f8a5b", "#3d5a80", "#7a4069")  # ochre to plum, from small sizes to large
GRAY = "#8a8a8a"
MARKERS = "osD^vP"


@contextmanager
def sheet(title: str, rows: int = 2) -> Iterator[tuple[Figure, list[Axes]]]:
    """A figure with two panels in each row and a title above them."""
    with mpl.rc_context(
        {
            "font.size": 9,
            "axes.spines.top": False,
            "axes.spines.right": False,
            "axes.titlesize": 9,
            "axes.titlelocation": "left",
        }
    ):
        figure = Figure(figsize=(9.0, 3.2 * rows), layout="constrained")
        panels = [figure.add_subplot(rows, 2, place + 1) for place in range(2 * rows)]
        figure.suptitle(title.replace(" = ", "\u00a0=\u00a0"), fontsize=9, x=0.01, ha="left", wrap=True)
        yield figure, panels


def inks(count: int) -> list[str]:
    """So many colors in order."""
    shades = LinearSegmentedColormap.from_list("inks", _INKS)
    return [to_hex(shades(i / max(1, count - 1))) for i in range(count)]


def marker(index: int) -> str:
    """The marker of the curve of that number."""
    return MARKERS[index % len(MARKERS)]


def dots(axes: Axes, x: Vector, y: Vector, error: Vector, color: str, index: int, label: str) -> None:
    """Points with error bars of one standard error."""
    axes.errorbar(x, y, yerr=error, color=color, marker=marker(index), ms=3.5, lw=0, elinewidth=0.9, label=label)


def doublings(axes: Axes) -> None:
    """x in powers of two, written as plain numbers: sizes and lengths are read that way."""
    axes.set_xscale("log", base=2)
    axes.xaxis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:g}"))


def residual_panel(axes: Axes, x_label: str) -> None:
    """Zero and two standard errors to either side."""
    axes.axhspan(-2, 2, color=GRAY, alpha=0.12, lw=0)
    axes.axhline(0, color=GRAY, lw=0.8)
    axes.set(xlabel=x_label, ylabel="(data - fit) / error", title="residuals")


def drift_panel(axes: Axes, rows: Sequence[Row], name: str, quoted: tuple[float, float | None]) -> None:
    """One quantity of every variation, against the quoted value and its error."""
    value, error = quoted
    axes.axvline(value, color=GRAY, lw=0.8)
    if error is not None:
        axes.axvspan(value - error, value + error, color=GRAY, alpha=0.2, lw=0)
    low, high = _drift_range(rows, name, quoted)
    for place, row in enumerate(rows):
        at = float(np.clip(row.values[name], low, high))
        if row.accepted:
            axes.errorbar([at], [place], xerr=[row.errors[name]], marker="o", ms=4, color=_INKS[2])
        else:  # an arrowhead at the edge stands for what lies beyond it
            shape = "x" if at == row.values[name] else "<" if at == low else ">"
            axes.plot([at], [place], marker=shape, ms=4, color=GRAY, clip_on=False)
    axes.set_xlim(low, high)
    axes.set_yticks(range(len(rows)), [row.what for row in rows])
    axes.invert_yaxis()
    axes.ticklabel_format(axis="x", useOffset=False)
    axes.locator_params(axis="x", nbins=4)
    axes.set(xlabel=name, title="drift (crosses: fits that do not describe their data)")


def estimates_panel(axes: Axes, rows: Sequence[tuple[str, float, float | None]], name: str) -> None:
    """One quantity of several fits, each a name, a value and an error; the first is what is quoted."""
    _, value, error = rows[0]
    axes.axvline(value, color=GRAY, lw=0.8)
    if error is not None:
        axes.axvspan(value - error, value + error, color=GRAY, alpha=0.2, lw=0)
    for place, (_, at, width) in enumerate(rows):
        axes.errorbar([at], [place], xerr=[width or 0.0], marker="o", ms=4, color=_INKS[2])
    axes.set_yticks(range(len(rows)), [what for what, _, _ in rows])
    axes.invert_yaxis()
    axes.ticklabel_format(axis="x", useOffset=False)
    axes.locator_params(axis="x", nbins=4)
    axes.set(xlabel=name, title="drift with the points taken")


def _drift_range(rows: Sequence[Row], name: str, quoted: tuple[float, float | None]) -> tuple[float, float]:
    """The range of accepted fits and of the quoted value, with a margin; of all fits where none is accepted."""
    shown = [row for row in rows if row.accepted] or rows
    widths = [row.errors[name] if row.accepted else 0.0 for row in shown]
    ends = [row.values[name] + side * width for row, width in zip(shown, widths, strict=True) for side in (-1, 1)]
    value, error = quoted
    ends += [value - 1.5 * (error or 0.0), value + 1.5 * (error or 0.0)]
    margin = 0.08 * (max(ends) - min(ends)) or abs(value) * 0.01 or 1.0
    return min(ends) - margin, max(ends) + margin


def saved(figure: Figure, path: str | Path | None) -> Figure:
    """The figure, written to `path` if there is one."""
    if path is not None:
        figure.savefig(path, dpi=160)
    return figure
