"""Data collapse without a scaling function: p_c and the exponents that make the curves of all sizes fall on one."""

import json
import math
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from sweepmill.analysis.arrays import Mask, Matrix, Vector
from sweepmill.analysis.collapse_drift import NEAR
from sweepmill.analysis.drift import excess
from sweepmill.analysis.estimate import Estimate, finite, with_error
from sweepmill.analysis.model_free_search import DRAWS, Measure, Search, error_of, named, perturbed
from sweepmill.analysis.points import Points
from sweepmill.analysis.wording import listed
from sweepmill.text import aligned

if TYPE_CHECKING:
    from matplotlib.figure import Figure

_TOO_LARGE = 5.0  # standard deviations of the quality above 1, by the law of chi^2 per point


@dataclass(frozen=True, eq=False)
class Window:
    """The search on part of the points; `moved` from the one on all, `noise` the error of that by noise alone."""

    kind: str
    what: str
    points: int
    values: dict[str, float]
    errors: Vector
    moved: Vector
    noise: Vector

    def to_dict(self) -> dict[str, Any]:
        """Plain values."""
        errors = dict(zip(self.values, self.errors.tolist(), strict=True))
        return {"what": self.what, "points": self.points, "values": self.values, "errors": errors}


@dataclass(frozen=True, eq=False)
class ModelFree:
    """Result of `fit_model_free`: `value` of the measure, `estimates` by name, `windows` with parts of the points."""

    points: Points
    measure: Measure
    value: float
    estimates: dict[str, Estimate]
    flags: tuple[str, ...]
    windows: tuple[Window, ...]

    def __getitem__(self, name: str) -> Estimate:
        return self.estimates[name]

    def __str__(self) -> str:
        values = ", ".join(f"{name} = {estimate}" for name, estimate in self.estimates.items())
        sizes = listed(self.points.distinct_sizes())
        data = f"Model-free collapse of L = {sizes} ({len(self.points)} points; {self.measure} {self.value:.3g})"
        if self.flags:
            return f"{data} is not to be quoted: {'; '.join(self.flags)}; the best values are {values}."
        how = f"halves of {self.points.folds} folds" if self.points.folds else f"{DRAWS} synthetic data sets"
        return f"{data} gives {values}; errors are from {how} and include the spread between windows."

    def scaled(self) -> tuple[Vector, Vector]:
        """The scaling variable u and the factor L^(zeta/nu) of y, both [n], at the best values."""
        values = [self[name].value if name in self.estimates else 0.0 for name in ("p_c", "nu", "zeta")]
        p_c, nu, zeta = values
        return (self.points.x - p_c) * self.points.sizes ** (1 / nu), self.points.sizes ** (zeta / nu)

    def plot(self, path: str | Path | None = None, x_label: str = "p", y_label: str = "y") -> "Figure":
        """Data, collapse, distances and windows in one figure, written to `path` if given."""
        from sweepmill.analysis.plot_model_free import plot_model_free

        return plot_model_free(self, path, x_label, y_label)

    def text(self) -> str:
        """The windows as aligned text, the search on all points first."""
        rows = [["all", len(self.points), *(str(one) for one in self.estimates.values())]]
        for one in self.windows:
            values = (with_error(v, float(e)) for v, e in zip(one.values.values(), one.errors, strict=True))
            rows.append([one.what, one.points, *values])
        return aligned(["points of", "number", *self.estimates], rows)

    def to_dict(self) -> dict[str, Any]:
        """Everything as plain values, with the keys of the ensembles it rests on."""
        return {
            "analysis": "model-free collapse",
            "measure": self.measure,
            "value": finite(self.value),
            "estimates": {name: estimate.to_dict() for name, estimate in self.estimates.items()},
            "flags": list(self.flags),
            "windows": [one.to_dict() for one in self.windows],
            "folds": self.points.folds,
            "ensembles": self.points.ensembles,
        }

    def to_json(self) -> str:
        """`to_dict` as JSON text."""
        return json.dumps(self.to_dict(), indent=1, allow_nan=False)


def fit_model_free(points: Points, zeta: float | None = 0.0, measure: Measure = "quality") -> ModelFree:
    """Minimize a measure of collapse over p_c, nu and, where given as None, zeta.

    Errors are by jackknife over halves of the folds, or from synthetic data around the means where there are none
    (both with a fixed seed), with the spread between windows as far as noise does not explain it. A quality far above
    1 is flagged and the errors withheld; points must be close enough for straight lines between them. Raises
    ValueError for fewer than two sizes, or curves that hardly overlap.
    """
    if len(points.distinct_sizes()) < 2:
        raise ValueError("finite-size scaling needs at least two sizes")
    if np.ptp(points.x) == 0:
        raise ValueError("finite-size scaling needs more than one value of p")
    search = Search.of(points, zeta, measure)
    theta = search.from_grid(points.mean)
    value = search.cost(theta, points.mean)
    if math.isinf(value):
        raise ValueError("the curves of different sizes overlap too little to be compared")
    values, flags = named(theta), _flags(points, value, measure)
    if flags:
        unknown = {name: Estimate(one, math.nan, 0.0, flags[0]) for name, one in values.items()}
        return ModelFree(points, measure, value, unknown, flags, ())
    data = perturbed(points)
    found = search.again(points.mean, theta, data)
    errors, windows = error_of(found), tuple(_windows(points, zeta, measure, theta, data, found))
    estimates = {
        name: Estimate(one, float(errors[index]), _spread(windows, index, float(errors[index])), "")
        for index, (name, one) in enumerate(values.items())
    }
    return ModelFree(points, measure, value, estimates, flags, windows)


def _flags(points: Points, value: float, measure: Measure) -> tuple[str, ...]:
    limit = 1 + _TOO_LARGE * math.sqrt(2 / len(points))
    if measure == "quality" and value > limit:
        return (f"the curves do not fall on one (quality {value:.3g}, more than {limit:.3g})",)
    return ()


def _windows(
    points: Points, zeta: float | None, measure: Measure, theta: Vector, data: Matrix, found: Matrix
) -> Iterator[Window]:
    base = np.array(list(named(theta).values()))
    for kind, what, keep in _parts(points, Search.of(points, zeta, measure), theta):
        part = points.taken(keep)
        search = Search.of(part, zeta, measure)
        if len(part) < 8 or len(part.distinct_sizes()) < 2 or math.isinf(search.cost(theta, part.mean)):
            continue
        there = search.best(part.mean, theta, 0.1 * search.bounds[2])
        again, values = search.again(part.mean, there, data[:, keep]), named(there)
        moved, noise = np.array(list(values.values())) - base, error_of(again - found)
        yield Window(kind, what, len(part), values, error_of(again), moved, noise)


def _parts(points: Points, search: Search, theta: Vector) -> Iterator[tuple[str, str, Mask]]:
    for size in points.distinct_sizes()[1:-1]:
        yield "sizes", f"L >= {size:g}", points.sizes >= size
    u = np.abs(search.frame.scaled(theta, points.x, points.sizes))
    for share in NEAR:
        yield "window", f"|u| <= {share * u.max():.3g}", u <= share * u.max()


def _spread(windows: tuple[Window, ...], index: int, error: float) -> float:
    spreads = [0.0]
    for kind in {one.kind for one in windows}:
        same = [one for one in windows if one.kind == kind]
        moved, noise = (np.array([column[index] for column in columns]) for columns in _columns(same))
        spreads.append(excess(moved, noise**2, error**2))
    return max(spreads)


def _columns(windows: list[Window]) -> tuple[list[Vector], list[Vector]]:
    return [one.moved for one in windows], [one.noise for one in windows]
