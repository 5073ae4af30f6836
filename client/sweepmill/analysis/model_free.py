"""Data collapse without a scaling function: p_c and the exponents that make the curves of all sizes fall on one."""

import json
import math
from dataclasses import dataclass
from functools import cached_property
from typing import Any, Literal

import numpy as np
from scipy.optimize import fmin

from sweepmill.analysis.arrays import Matrix, Vector
from sweepmill.analysis.collapse_drift import NEAR
from sweepmill.analysis.estimate import Estimate, finite
from sweepmill.analysis.jackknife import jackknife_error
from sweepmill.analysis.measures import quality, residual
from sweepmill.analysis.points import Points
from sweepmill.analysis.scaling import Frame, Scaling
from sweepmill.analysis.wording import listed

Measure = Literal["quality", "residual"]
DRAWS = 64  # synthetic data sets where there are no folds: the error is then known to about 9 %
_TOO_LARGE = 5.0  # standard deviations of the quality above 1, by the law of chi^2 per point


@dataclass(frozen=True, eq=False)
class ModelFree:
    """Result of `fit_model_free`: `value` of the measure, `estimates` by name, `windows` (what, number, estimates)."""

    points: Points
    measure: Measure
    value: float
    estimates: dict[str, Estimate]
    flags: tuple[str, ...]
    windows: tuple[tuple[str, int, dict[str, float]], ...]

    def __getitem__(self, name: str) -> Estimate:
        return self.estimates[name]

    def __str__(self) -> str:
        values = ", ".join(f"{name} = {estimate}" for name, estimate in self.estimates.items())
        sizes = listed(self.points.distinct_sizes())
        data = f"Model-free collapse of L = {sizes} ({len(self.points)} points; {self.measure} {self.value:.3g})"
        if self.flags:
            return f"{data} is not to be quoted: {'; '.join(self.flags)}; the best values are {values}."
        how = f"jackknife over {self.points.folds} folds" if self.points.folds else f"{DRAWS} synthetic data sets"
        return f"{data} gives {values}; errors are from {how}."

    def to_dict(self) -> dict[str, Any]:
        """Everything as plain values, with the keys of the ensembles it rests on."""
        return {
            "analysis": "model-free collapse",
            "measure": self.measure,
            "value": finite(self.value),
            "estimates": {name: estimate.to_dict() for name, estimate in self.estimates.items()},
            "flags": list(self.flags),
            "windows": [{"what": what, "points": count, "values": values} for what, count, values in self.windows],
            "folds": self.points.folds,
            "ensembles": self.points.ensembles,
        }

    def to_json(self) -> str:
        """`to_dict` as JSON text."""
        return json.dumps(self.to_dict(), indent=1, allow_nan=False)


@dataclass(frozen=True, eq=False)
class _Search:
    frame: Frame
    error: Vector
    measure: Measure

    @cached_property
    def bounds(self) -> tuple[Vector, Vector, Vector]:
        return self.frame.bounds()

    def cost(self, theta: Vector, y: Vector) -> float:
        lower, upper, _ = self.bounds
        if (theta <= lower).any() or (theta >= upper).any():
            return math.inf
        sizes = self.frame.sizes
        lift = (sizes / sizes.min()) ** self.frame.values(theta)["zeta_over_nu"]
        of = quality if self.measure == "quality" else residual
        return of(self.frame.scaled(theta, self.frame.x, sizes), y * lift, self.error * lift, sizes)

    def best(self, y: Vector, start: Vector, step: Vector) -> Vector:
        """Downhill simplex from corners at the steps, in units of them so that one tolerance serves all."""
        corners = np.vstack([np.zeros(len(start)), np.eye(len(start))])

        def cost(at: Vector) -> float:
            return self.cost(start + at * step, y)

        found = fmin(cost, corners[0], xtol=3e-3, ftol=1e-3, maxfun=300, disp=False, initial_simplex=corners)
        return np.asarray(start + found * step)

    def from_grid(self, y: Vector) -> Vector:
        grid = sorted(self.frame.starts(), key=lambda theta: self.cost(theta, y))[:2]
        _, upper, typical = self.bounds
        rough = [self.best(y, start, np.where(start + 0.1 * typical < upper, 0.1, -0.1) * typical) for start in grid]
        return self.best(y, min(rough, key=lambda theta: self.cost(theta, y)), 0.01 * typical)


def fit_model_free(points: Points, zeta: float | None = 0.0, measure: Measure = "quality") -> ModelFree:
    """Minimize a measure of collapse over p_c, nu and, where given as None, zeta.

    Errors are by jackknife over the folds, or from synthetic data around the means with a fixed seed where there are
    none. A quality far above 1 is flagged and the errors withheld; neighbors must be close enough for straight lines.
    Raises ValueError for fewer than two sizes, or curves that overlap nowhere.
    """
    if len(points.distinct_sizes()) < 2:
        raise ValueError("finite-size scaling needs at least two sizes")
    theta, value = _minimum(points, zeta, measure)
    if math.isinf(value):
        raise ValueError("the curves of different sizes overlap too little to be compared")
    flags = _flags(points, value, measure)
    errors = _errors(points, zeta, measure, theta)
    values = _named(theta)
    estimates = {
        name: Estimate(values[name], error, 0.0, flags[0] if flags else "")
        for name, error in zip(values, errors.tolist(), strict=True)
    }
    return ModelFree(points, measure, value, estimates, flags, _windows(points, zeta, measure, theta))


def _search(points: Points, zeta: float | None, measure: Measure) -> _Search:
    return _Search(Frame.of(Scaling(zeta=zeta), points), points.error, measure)


def _minimum(points: Points, zeta: float | None, measure: Measure) -> tuple[Vector, float]:
    search = _search(points, zeta, measure)
    theta = search.from_grid(points.mean)
    return theta, search.cost(theta, points.mean)


def _named(theta: Vector) -> dict[str, float]:
    named = {"p_c": float(theta[0]), "nu": float(1 / theta[1])}
    return named | ({"zeta": float(theta[2] / theta[1])} if len(theta) > 2 else {})


def _errors(points: Points, zeta: float | None, measure: Measure, theta: Vector) -> Vector:
    search = _search(points, zeta, measure)
    step = 0.01 * search.bounds[2]

    def values(data: Matrix) -> Matrix:
        return np.array([list(_named(search.best(y, theta, step)).values()) for y in data])

    if points.replicas is not None:
        return jackknife_error(values(points.replicas))
    noise = np.random.default_rng(0).standard_normal((DRAWS, len(points)))
    return np.asarray(values(points.mean + noise * points.error).std(axis=0, ddof=1))


def _flags(points: Points, value: float, measure: Measure) -> tuple[str, ...]:
    limit = 1 + _TOO_LARGE * math.sqrt(2 / len(points))
    if measure == "quality" and value > limit:
        return (f"the curves do not fall on one (quality {value:.3g}, more than {limit:.3g})",)
    return ()


def _windows(
    points: Points, zeta: float | None, measure: Measure, theta: Vector
) -> tuple[tuple[str, int, dict[str, float]], ...]:
    u = np.abs(Frame.of(Scaling(zeta=zeta), points).scaled(theta, points.x, points.sizes))
    parts = [(f"L >= {size:g}", points.taken(points.sizes >= size)) for size in points.distinct_sizes()[1:-1]]
    parts += [(f"|u| <= {share * u.max():.3g}", points.taken(u <= share * u.max())) for share in NEAR]
    kept = [(what, part) for what, part in parts if len(part) >= 8 and len(part.distinct_sizes()) > 1]
    found = [(what, part, *_minimum(part, zeta, measure)) for what, part in kept]
    return tuple((what, len(part), _named(at)) for what, part, at, value in found if math.isfinite(value))
