"""Was every circuit of a sweep deep enough, and how does the depth it needs grow with its size?"""

import json
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

from sweepmill.analysis.choosing import observed, size_column
from sweepmill.analysis.compare import Comparison
from sweepmill.analysis.estimate import with_error
from sweepmill.analysis.points import Points
from sweepmill.analysis.selecting import NotOneCurve
from sweepmill.analysis.steady import TOLERANCE, Steadiness, steady_series
from sweepmill.analysis.times import fit_times, settling_depths
from sweepmill.folds import Folds
from sweepmill.series import series_names, why_none
from sweepmill.table import Table
from sweepmill.text import aligned

if TYPE_CHECKING:
    from matplotlib.figure import Figure

WITHIN = 0.05  # the share of its final value within which a series counts as settled
_LAWS_FROM = 3  # sizes


@dataclass(frozen=True, eq=False)
class Depths:
    """Layers that series need, by size (x of `points`), where the other axes have the values in `label`."""

    label: str
    points: Points
    growth: Comparison | None

    def law(self) -> str:
        """What is known of the growth."""
        if self.growth is None:
            return "too few sizes"
        if self.growth.verdict is None:
            return "cannot tell"
        best = self.growth.shown
        return f"{best.fitted.law.formula}, " + ", ".join(f"{n} = {v}" for n, v in list(best.estimates.items())[:2])


@dataclass(frozen=True, eq=False)
class SweepSteadiness:
    """Result of `steady_sweep`: the verdict on every ensemble, and the depths that are needed."""

    name: str
    steadiness: Steadiness
    depths: tuple[Depths, ...]

    def __str__(self) -> str:
        return f"{self.name}: {self.steadiness.summary()}"

    def text(self) -> str:
        """Verdicts, and depths where several sizes give one, as aligned tables."""
        blocks = [self.steadiness.text()]
        sizes = sorted({size for one in self.depths for size in one.points.x.tolist()})
        if sizes:
            head = ["circuit", *(f"L = {size:g}" for size in sizes), "growth with size"]
            rows = [[one.label or "all", *_by_size(one.points, sizes), one.law()] for one in self.depths]
            blocks.append(f"Layers until the mean stays within {100 * WITHIN:g} % of its last quarter:")
            blocks[-1] += "\n" + aligned(head, rows)
        return "\n\n".join(blocks)

    def to_dict(self) -> dict[str, Any]:
        """Everything as plain values, with the keys of the ensembles."""
        return {**self.steadiness.to_dict(), "observation": self.name, "depths": [_plain(one) for one in self.depths]}

    def to_json(self) -> str:
        """`to_dict` as JSON text."""
        return json.dumps(self.to_dict(), indent=1, allow_nan=False)

    def plot(self, path: str | Path | None = None, x_label: str = "layer", y_label: str = "") -> "Figure":
        """The series and the changes between their last quarters in one figure, written to `path` if given."""
        return self.steadiness.plot(path, x_label, y_label or self.name)


def steady_sweep(table: Table, of: str | None = None, tolerance: float = TOLERANCE) -> SweepSteadiness:
    """Judge every ensemble of a sweep, from its folds (or its table, with bounds for errors), as `steady_yet` does.

    `of` may be left out where one observation only was read along the layers. Raises NotOneCurve for a choice that
    is missing, ValueError where nothing was read along the layers that can settle.
    """
    names = series_names(table)
    if not names:
        raise ValueError(why_none(table))
    if of is None and len(names) > 1:
        raise NotOneCurve(f"the observation is to be chosen with --of: {', '.join(names)}")
    if of is not None and of not in names:
        raise NotOneCurve(f"{of!r} is no series along the layers that can settle: {', '.join(names)}")
    rows = observed(table, of or names[0])
    sizes = size_column(rows)
    parts = list(_by_columns(rows, rows.axes))
    labels = tuple(label or (of or names[0]) for label, _ in parts)
    verdicts = steady_series(tuple(_points(part, sizes) for _, part in parts), tolerance, labels)
    return SweepSteadiness(of or names[0], verdicts, tuple(_depths(rows, sizes)))


def _depths(rows: Table, sizes: str) -> Iterator[Depths]:
    if sizes not in rows:
        return
    for label, part in _by_columns(rows, tuple(axis for axis in rows.axes if axis != sizes)):
        if len(set(part.values(sizes))) < 2:
            continue
        try:
            points = settling_depths(_points(part, sizes), WITHIN)
        except ValueError:
            continue  # no series of these settles within its first half
        yield Depths(label, points, fit_times(points) if len(points) >= _LAWS_FROM else None)


def _by_columns(table: Table, columns: tuple[str, ...]) -> Iterator[tuple[str, Table]]:
    """The rows for each combination of values, with how to call it."""
    found: dict[tuple[Any, ...], list[int]] = {}
    for index, row in enumerate(table.rows()):
        found.setdefault(tuple(row[name] for name in columns), []).append(index)
    for values, of in found.items():
        yield ", ".join(f"{name} = {value}" for name, value in zip(columns, values, strict=True)), table.taken(of)


def _points(table: Table, sizes: str) -> Points:
    return (
        Points.from_folds(table, "layer", sizes)
        if isinstance(table, Folds)
        else Points.from_table(table, "layer", sizes)
    )


def _by_size(points: Points, sizes: list[float]) -> list[str]:
    found = dict(zip(points.x.tolist(), zip(points.mean, points.error, strict=True), strict=True))
    return [with_error(*found[size]) if size in found else "" for size in sizes]


def _plain(depths: Depths) -> dict[str, Any]:
    points = depths.points
    rows = zip(points.x.tolist(), points.mean.tolist(), points.error.tolist(), strict=True)
    return {
        "circuit": depths.label,
        "within": WITHIN,
        "depths": [{"size": size, "layers": layers, "error": error} for size, layers, error in rows],
        "growth": None if depths.growth is None else depths.growth.to_dict(),
    }
