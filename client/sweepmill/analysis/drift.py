"""How estimates move when data are left out or the function is varied, and what of it noise does not explain."""

import math
from dataclasses import dataclass
from typing import Any, Protocol

import numpy as np

from sweepmill.analysis.arrays import Matrix, Vector
from sweepmill.analysis.estimate import finite, with_error
from sweepmill.analysis.goodness import Goodness
from sweepmill.analysis.jackknife import jackknife_error
from sweepmill.analysis.points import Points
from sweepmill.text import aligned


class AnyFit(Protocol):
    """What a fit must tell to have its drift looked at: a scaling form or a law."""

    @property
    def names(self) -> list[str]: ...
    @property
    def points(self) -> Points: ...
    @property
    def values(self) -> Vector: ...
    @property
    def variances(self) -> Vector: ...
    @property
    def replicas(self) -> Matrix | None: ...
    @property
    def goodness(self) -> Goodness: ...
    def faults(self, acceptable: float) -> list[str]: ...


@dataclass(frozen=True)
class Row:
    """One variation of a fit: `kind` is "sizes", "window" or "shape".

    `values`, `errors` are by quantity; `moved` is by how much each moved from the first fit, `noise` the error of
    that difference by noise alone. `accepted` tells whether the varied fit describes its data.
    """

    kind: str
    what: str
    points: int
    values: dict[str, float]
    errors: dict[str, float]
    moved: dict[str, float]
    noise: dict[str, float]
    goodness: Goodness
    accepted: bool

    def to_dict(self) -> dict[str, Any]:
        """Plain values."""
        numbers = {name: finite(value) for name, value in self.values.items()}
        errors = {name: finite(value) if self.accepted else None for name, value in self.errors.items()}
        fit = {"chi2": finite(self.goodness.chi2), "dof": self.goodness.dof, "p_value": finite(self.goodness.p_value)}
        return {"kind": self.kind, "what": self.what, "points": self.points, "values": numbers, "errors": errors, **fit}


def drift_row(kind: str, what: str, base: AnyFit, varied: AnyFit, acceptable: float) -> Row:
    """How a varied fit differs from the first one."""
    shared = [varied.names.index(name) for name in base.names]
    values, errors = varied.values[shared], np.sqrt(varied.variances[shared])

    def by_name(numbers: Vector) -> dict[str, float]:
        return dict(zip(base.names, numbers.tolist(), strict=True))

    return Row(
        kind,
        what,
        len(varied.points),
        by_name(values),
        by_name(errors),
        by_name(values - base.values),
        by_name(_noise(base, varied, shared)),
        varied.goodness,
        not varied.faults(acceptable),
    )


def _noise(base: AnyFit, varied: AnyFit, shared: list[int]) -> Vector:
    """Errors of the differences; for a subset of the data, or a richer function, variances simply subtract."""
    if base.replicas is not None and varied.replicas is not None:
        return jackknife_error(varied.replicas[:, shared] - base.replicas)
    return np.asarray(np.sqrt(np.abs(varied.variances[shared] - base.variances)))


def excess_spread(rows: tuple[Row, ...], name: str, variance: float) -> float:
    """What the variations of a quantity disagree by beyond noise, as one standard deviation.

    The largest over the kinds of variation, of their accepted rows; `variance` is that of the fit itself.
    """
    spreads = [0.0]
    for kind in {row.kind for row in rows if row.accepted}:
        same = [row for row in rows if row.kind == kind and row.accepted]
        moved, noise = (
            np.array([by[name] for by in column]) for column in zip(*((r.moved, r.noise) for r in same), strict=True)
        )
        spreads.append(excess(moved, noise**2, variance))
    return max(spreads)


def excess(moved: Vector, noise: Vector, variance: float) -> float:
    """Root of the mean of moved^2 - 2 noise, both [n], with noise the variances of the moves; 0 where it is negative.

    Twice the noise, because a smaller margin would widen most errors where there is nothing but noise. Moves count
    less the noisier they are against the `variance` of the fit itself.
    """
    return math.sqrt(max(0.0, float(np.average(moved**2 - 2 * noise, weights=(noise + variance) ** -2))))


def drift_text(first: Row, rows: tuple[Row, ...]) -> str:
    """A table for reading, the fit itself first."""
    names = list(first.values)
    lines = [
        [row.what, row.points, *_cells(row, names), _ratio(row.goodness), f"{row.goodness.p_value:.2g}"]
        for row in (first, *rows)
    ]
    return aligned(["fit", "points", *names, "chi2/dof", "p"], lines)


def _ratio(goodness: Goodness) -> str:
    return f"{goodness.chi2:.1f}/{goodness.dof:.4g}"


def _cells(row: Row, names: list[str]) -> list[str]:
    if not row.accepted:
        return [f"{row.values[name]:.5g}" for name in names]
    return [with_error(row.values[name], row.errors[name]) for name in names]


def first_row(base: AnyFit, acceptable: float) -> Row:
    """The fit itself as a row."""
    return drift_row("all", "all", base, base, acceptable)
