"""The search for the exponents that make curves fall on one, and its repetition on replicas."""

import math
from dataclasses import dataclass
from functools import cached_property
from typing import Literal

import numpy as np
from scipy.optimize import fmin

from sweepmill.analysis.arrays import Matrix, Vector
from sweepmill.analysis.measures import quality, residual
from sweepmill.analysis.points import Points
from sweepmill.analysis.scaling import Frame, Scaling

Measure = Literal["quality", "residual"]
_HALVINGS = 14
_OUTSIDE = 1e300  # in place of infinity, whose differences are not numbers
DRAWS = 64  # repetitions from which errors are found, to about 9 %


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
            return min(self.cost(start + at * step, y), _OUTSIDE)

        flat = 1e-3 * cost(corners[0])
        found = fmin(cost, corners[0], xtol=0.01, ftol=flat, maxfun=300, disp=False, initial_simplex=corners)
        return np.asarray(start + found * step)

    def from_grid(self, y: Vector) -> Vector:
        grid = sorted(self.frame.starts(), key=lambda theta: self.cost(theta, y))[:2]
        _, upper, typical = self.bounds
        rough = [self.best(y, start, np.where(start + 0.1 * typical < upper, 0.1, -0.1) * typical) for start in grid]
        theta = min(rough, key=lambda one: self.cost(one, y))
        return self.best(y, theta, self.step(y, theta))

    def step(self, y: Vector, theta: Vector) -> Vector:
        """Steps from a minimum that double the measure: some standard errors, far enough not to stick in its jumps."""
        steps, limit = 0.05 * self.bounds[2], 2 * self.cost(theta, y)
        for index, direction in enumerate(np.eye(len(theta))):
            for _ in range(_HALVINGS):
                if self.cost(theta + steps[index] * direction, y) <= limit:
                    break
                steps[index] /= 2
        return steps

    @classmethod
    def of(cls, points: Points, zeta: float | None, measure: Measure) -> "Search":
        """The search on some points."""
        return cls(Frame.of(Scaling(zeta=zeta), points), points.error, measure)

    def again(self, y: Vector, theta: Vector, data: Matrix) -> Matrix:
        """Exponents (as `named` gives them) of other data [rows, n] from the minimum theta for y."""
        step = self.step(y, theta)
        return np.array([list(named(self.best(one, theta, step)).values()) for one in data])


def named(theta: Vector) -> dict[str, float]:
    """Exponents by name."""
    zeta = {"zeta": float(theta[2] / theta[1])} if len(theta) > 2 else {}
    return {"p_c": float(theta[0]), "nu": float(1 / theta[1]), **zeta}


def perturbed(points: Points) -> Matrix:
    """Data [DRAWS, n] whose deviations from the means are as large as the errors, with a fixed seed.

    Means over random halves of the folds: the measures are not smooth, so leaving out single folds would tell too
    little, while the jackknife that leaves out many does tell (An Introduction to the Bootstrap (1993), section 11.7).
    Without folds, Gaussian noise on the means.
    """
    generator = np.random.default_rng(0)
    if points.replicas is None:
        return np.asarray(points.mean + generator.standard_normal((DRAWS, len(points))) * points.error)
    folds = points.folds
    values = folds * points.mean - (folds - 1) * points.replicas  # what the folds alone gave
    halves = np.stack([generator.permutation(folds)[: folds // 2] for _ in range(DRAWS)])
    return np.asarray(values[halves].mean(axis=1))


def error_of(values: Matrix) -> Vector:
    """Standard errors of what was found on the rows of `perturbed`."""
    return np.asarray(values.std(axis=0, ddof=1))
