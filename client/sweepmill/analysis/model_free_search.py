"""The search for the exponents that make curves fall on one, and its repetition on replicas."""

import math
from dataclasses import dataclass
from functools import cached_property
from typing import Literal

import numpy as np
from scipy.optimize import fmin

from sweepmill.analysis.arrays import Matrix, Vector
from sweepmill.analysis.jackknife import jackknife_error
from sweepmill.analysis.measures import quality, residual
from sweepmill.analysis.points import Points
from sweepmill.analysis.scaling import Frame, Scaling

Measure = Literal["quality", "residual"]
DRAWS = 64  # synthetic data sets where there are no folds: the error is then known to about 9 %


@dataclass(frozen=True, eq=False)
class Search:
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

    @classmethod
    def of(cls, points: Points, zeta: float | None, measure: Measure) -> "Search":
        """The search on some points."""
        return cls(Frame.of(Scaling(zeta=zeta), points), points.error, measure)

    def again(self, data: Matrix, theta: Vector) -> Matrix:
        """Exponents (as `named` gives them) of other data [rows, n] from a minimum found before."""
        step = 0.01 * self.bounds[2]
        return np.array([list(named(self.best(y, theta, step)).values()) for y in data])


def named(theta: Vector) -> dict[str, float]:
    """Exponents by name."""
    zeta = {"zeta": float(theta[2] / theta[1])} if len(theta) > 2 else {}
    return {"p_c": float(theta[0]), "nu": float(1 / theta[1]), **zeta}


def perturbed(points: Points) -> Matrix:
    """The replicas of the folds, or synthetic data around the means with a fixed seed, [rows, n]."""
    if points.replicas is not None:
        return points.replicas
    noise = np.random.default_rng(0).standard_normal((DRAWS, len(points)))
    return np.asarray(points.mean + noise * points.error)


def error_of(points: Points, values: Matrix) -> Vector:
    """Standard errors of what was found on the rows of `perturbed`."""
    return jackknife_error(values) if points.folds else np.asarray(values.std(axis=0, ddof=1))
