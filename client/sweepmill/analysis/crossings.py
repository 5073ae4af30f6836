"""Crossings of neighboring sizes, extrapolated to infinite size."""

import json
from collections.abc import Iterator
from dataclasses import dataclass, replace
from itertools import pairwise
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from sweepmill.analysis.crossing import Crossing, crossing
from sweepmill.analysis.drift import excess
from sweepmill.analysis.estimate import Estimate, finite, with_error
from sweepmill.analysis.extrapolate import extrapolate
from sweepmill.analysis.goodness import ACCEPTABLE, Goodness
from sweepmill.analysis.points import Points
from sweepmill.analysis.wording import listed
from sweepmill.text import aligned

if TYPE_CHECKING:
    from matplotlib.figure import Figure


@dataclass(frozen=True, eq=False)
class Crossings:
    """Result of `fit_crossings`: the table of crossings and p_c = limit of p_c + a L^-power, L the smaller size.

    `estimates` has `p_c`, `amplitude` and, where it was free, `power`; it is empty where fewer than two pairs cross.
    `drift` is p_c without the smallest pair and with other degrees of the local polynomials.
    """

    points: Points
    table: tuple[Crossing, ...]
    power: float | None
    estimates: dict[str, Estimate]
    goodness: Goodness | None
    flags: tuple[str, ...]
    drift: tuple[tuple[str, Estimate], ...]

    def __getitem__(self, name: str) -> Estimate:
        return self.estimates[name]

    def __str__(self) -> str:
        sizes = listed(self.points.distinct_sizes())
        values = ", ".join(f"{name} = {estimate}" for name, estimate in self.estimates.items())
        data = f"Crossings of neighboring sizes among L = {sizes}"
        if self.flags:
            return f"{data} are not to be extrapolated: {'; '.join(self.flags)}" + (f" ({values})." if values else ".")
        power = "a free power" if self.power is None else f"L^-{self.power:g}"
        end = "errors include the spread between fits"
        return f"{data}, extrapolated with {power}, give {values} with {self.goodness}; {end}."

    def text(self) -> str:
        """The table of crossings, aligned."""
        rows = [
            [f"{c.small:g}, {c.large:g}", with_error(c.place, c.place_error), with_error(c.nu, c.nu_error), c.fault]
            for c in self.table
        ]
        return aligned(["sizes", "crossing", "nu by slopes", "fault"], rows)

    def to_dict(self) -> dict[str, Any]:
        """Everything as plain values, with the keys of the ensembles it rests on."""
        names = ("small", "large", "place", "place_error", "nu", "nu_error")
        rows = [{**{name: finite(getattr(c, name)) for name in names}, "fault": c.fault or None} for c in self.table]
        return {
            "analysis": "crossings",
            "table": rows,
            "power": self.power,
            "estimates": {name: estimate.to_dict() for name, estimate in self.estimates.items()},
            "p_value": None if self.goodness is None else finite(self.goodness.p_value),
            "flags": list(self.flags),
            "drift": [{"what": what, **p_c.to_dict()} for what, p_c in self.drift],
            "folds": self.points.folds,
            "ensembles": self.points.ensembles,
        }

    def to_json(self) -> str:
        """`to_dict` as JSON text."""
        return json.dumps(self.to_dict(), indent=1, allow_nan=False)

    def plot(self, path: str | Path | None = None, x_label: str = "p", y_label: str = "y") -> "Figure":
        """Data and crossings with their extrapolation in one figure, written to `path` if given."""
        from sweepmill.analysis.plot_crossings import plot_crossings

        return plot_crossings(self, path, x_label, y_label)


def fit_crossings(
    points: Points, degree: int = 3, power: float | None = 1.0, acceptable: float = ACCEPTABLE
) -> Crossings:
    """Crossings of every size with the next by local polynomials, extrapolated in L^-power (None: a free power).

    Choose points near the crossings: a local polynomial that does not describe its points is a fault of that pair,
    which is then left out. Errors by jackknife where there are folds, else propagated; crossings that share a size
    are correlated, and that is taken into account. Raises ValueError for fewer than two sizes.
    """
    if len(points.distinct_sizes()) < 2:
        raise ValueError("crossings need at least two sizes")
    table = _table(points, degree, acceptable)
    good = [one for one in table if not one.fault]
    if len(good) < 2:
        return Crossings(points, table, power, {}, None, ("fewer than two pairs cross without fault",), ())
    estimates, goodness, flags = extrapolate(points.error, good, power, acceptable)
    drift = tuple(_varied(points, good, degree, power, acceptable))
    p_c = estimates["p_c"]
    estimates["p_c"] = replace(p_c, spread=_spread(p_c, drift))
    return Crossings(points, table, power, estimates, goodness, flags, drift)


def _table(points: Points, degree: int, acceptable: float) -> tuple[Crossing, ...]:
    return tuple(crossing(points, a, b, degree, acceptable) for a, b in pairwise(points.distinct_sizes()))


def _varied(
    points: Points, good: list[Crossing], degree: int, power: float | None, acceptable: float
) -> Iterator[tuple[str, Estimate]]:
    """p_c without the smallest pair and with other degrees, where that leaves a degree of freedom."""
    variants = [("without the smallest pair", good[1:])]
    for other in (degree - 1, degree + 1):
        table = _table(points, other, acceptable) if other > 0 else ()
        variants.append((f"polynomials of degree {other}", [one for one in table if not one.fault]))
    for what, crossings in variants:
        if len(crossings) > 2 + (power is None):
            yield what, extrapolate(points.error, crossings, power, acceptable)[0]["p_c"]


def _spread(p_c: Estimate, drift: tuple[tuple[str, Estimate], ...]) -> float:
    """The largest move of p_c beyond noise; variances of nested choices of data and functions subtract."""
    spreads = [0.0]
    for _, one in drift:
        if one.error is not None:
            noise = abs(one.statistical**2 - p_c.statistical**2)
            spreads.append(excess(np.array([one.value - p_c.value]), np.array([noise]), p_c.statistical**2))
    return max(spreads)
