"""The figure of distributions: shares of every value as they were counted, and how they differ."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING

import numpy as np

from sweepmill.analysis.arrays import Vector
from sweepmill.analysis.distribution import Distribution
from sweepmill.analysis.plot import GRAY, inks, saved, sheet
from sweepmill.analysis.random_states import ExactLaw
from sweepmill.extras import needing

with needing("plot()", "analysis"):
    from matplotlib.ticker import MaxNLocator

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

MOST_NAMED = 12


def plot_distributions(
    found: Sequence[Distribution],
    path: str | Path | None,
    x_label: str,
    title: str = "",
    laws: Sequence[ExactLaw | None] = (),
) -> Figure:
    """Two panels. Bars for one distribution, steps for several, with one standard error from the folds at each value.

    Beside them the difference from an exact law (`laws` has one for each distribution, or none), or of two
    distributions, in standard errors; else the same shares on a logarithmic scale. Raises ValueError for none.
    """
    if not found:
        raise ValueError("nothing to draw")
    exact: Sequence[ExactLaw | None] = laws or [None] * len(found)
    with sheet(title, rows=1) as (figure, (shares, beside)):
        step = _step(found)
        colors = inks(max(3, len(found)))
        for one, law, color in zip(found, exact, colors, strict=False):
            _shares(shares, one, step, color, bars=len(found) == 1)
            if law is not None:
                _law(shares, law, named=one is found[0])
        shares.set(xlabel=x_label, ylabel="share of readings", title="distribution")
        shares.set_ylim(bottom=0)
        if len(found) <= MOST_NAMED:
            handles = shares.get_legend_handles_labels()
            figure.legend(*handles, loc="outside lower center", ncols=min(4, len(found) + 1), frameon=False)
        if any(law is not None for law in exact):
            for one, law, color in zip(found, exact, colors, strict=False):
                if law is not None:
                    _difference(beside, one, _at(law.values, law.probabilities, one.values), one.errors, color)
            beside.set(ylabel="(share - law) / error", title="difference from the law")
        elif len(found) == 2:
            _two(beside, found[0], found[1], colors[0])
        else:
            for one, color in zip(found, colors, strict=False):
                _shares(beside, one, step, color, bars=False)
            beside.set_yscale("log")
            beside.set(ylabel="share of readings", title="the same, logarithmic")
        beside.set(xlabel=x_label)
        if step == 1:
            for axes in (shares, beside):
                axes.xaxis.set_major_locator(MaxNLocator(integer=True))
    return saved(figure, path)


def _step(found: Sequence[Distribution]) -> float:
    """Distance of neighboring values: 1 for integers, less for averages of several readings."""
    values = np.unique(np.concatenate([one.values for one in found]))
    return float(np.diff(values).min()) if len(values) > 1 else 1.0


def _shares(axes: Axes, one: Distribution, step: float, color: str, bars: bool) -> None:
    if bars:
        axes.bar(one.values, one.shares, width=0.85 * step, color=color, alpha=0.55, label=one.label)
    else:
        edges, heights = _outline(one, step)
        axes.stairs(heights, edges, color=color, lw=1.1, label=one.label)
    axes.errorbar(one.values, one.shares, yerr=one.errors, color=color, lw=0, elinewidth=0.9, ms=2, marker="o")


def _outline(one: Distribution, step: float) -> tuple[Vector, Vector]:
    """Edges and heights of steps around each value, down to 0 where values between did not occur."""
    count = round((one.values[-1] - one.values[0]) / step) + 1
    heights = np.zeros(count)
    heights[np.rint((one.values - one.values[0]) / step).astype(np.int64)] = one.shares
    return one.values[0] + step * (np.arange(count + 1) - 0.5), heights


def _law(axes: Axes, law: ExactLaw, named: bool) -> None:
    shown = law.probabilities > law.probabilities.max() * 1e-6
    label = law.name if named else None
    axes.plot(law.values[shown], law.probabilities[shown], "_", ms=11, mew=1.6, color="black", label=label)


def _at(values: Vector, numbers: Vector, wanted: Vector) -> Vector:
    known = dict(zip(values.tolist(), numbers.tolist(), strict=True))
    return np.array([known.get(value, 0.0) for value in wanted.tolist()])


def _difference(axes: Axes, one: Distribution, expected: Vector, errors: Vector, color: str) -> None:
    _band(axes)
    able = errors > 0
    axes.plot(one.values[able], (one.shares - expected)[able] / errors[able], "o", ms=3.5, color=color, label=one.label)


def _two(axes: Axes, first: Distribution, second: Distribution, color: str) -> None:
    values = np.union1d(first.values, second.values)
    both = (first, second)
    shares = [_at(one.values, one.shares, values) for one in both]
    error = np.hypot(*(_at(one.values, one.errors, values) for one in both))
    able = error > 0
    _band(axes)
    axes.plot(values[able], (shares[1] - shares[0])[able] / error[able], "o", ms=3.5, color=color)
    axes.set(ylabel="difference / error", title=f"{second.label} minus {first.label}")


def _band(axes: Axes) -> None:
    """Zero and two standard errors to either side, drawn once."""
    if not axes.lines:
        axes.axhspan(-2, 2, color=GRAY, alpha=0.12, lw=0)
        axes.axhline(0, color=GRAY, lw=0.8)
