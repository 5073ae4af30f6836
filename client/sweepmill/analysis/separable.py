"""Least squares in which most parameters are linear: they are solved for inside, only the others are searched for.

Variable projection with the gradient of The differentiation of pseudo-inverses and nonlinear least squares problems
whose variables separate, SIAM J. Numer. Anal. 10, 413 (1973), and the approximate Jacobian of BIT 15, 49 (1975)
(both from memory); the approximation leaves the gradient exact.
"""

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
from scipy.optimize import least_squares

from sweepmill.analysis.arrays import Matrix, Vector
from sweepmill.analysis.whitening import Whitening

STEP = 1e-6  # of the size of a parameter: central differences are good to about 1e-10 there
_EXACT = 1e-9  # residuals below this share of the data are rounding
_REFITS, _SETTLED = 20, 1e-3  # steps, and the step in units of the error at which a refit is done


@dataclass(frozen=True, eq=False)
class Problem:
    """Minimize |W (y - A(theta) c)| over theta [m] within bounds and over c [k].

    `design` gives A, shape [n, k]; `typical` [m] are the sizes of changes of theta that matter.
    """

    design: Callable[[Vector], Matrix]
    whitening: Whitening
    lower: Vector
    upper: Vector
    typical: Vector

    def solve(self, y: Vector, starts: Sequence[Vector]) -> "Solution":
        """The best minimum found from the starts. Raises ValueError if the design is not finite at any of them."""
        target = self.whitening.apply(y)
        if len(self.lower) == 0:
            return self._at(np.empty(0), target, True)
        found = [self._descend(target, start) for start in starts]
        return min(found, key=lambda one: one.chi2)

    def projected(self, theta: Vector, target: Vector) -> tuple[Vector, Vector, Matrix]:
        """Residuals, linear coefficients and the orthonormal basis of the whitened design at theta."""
        q, r = np.linalg.qr(self.whitening.apply(self.design(theta)))
        inside = q.T @ target
        return target - q @ inside, np.linalg.lstsq(r, inside, rcond=None)[0], q

    def slopes(self, theta: Vector, coefficients: Vector) -> Matrix:
        """Whitened derivative [n, m] of the model by theta at fixed coefficients."""
        columns = []
        for index, size in enumerate(self.typical):
            step = np.zeros_like(theta)
            step[index] = STEP * size
            change = self.design(theta + step) - self.design(theta - step)
            columns.append(self.whitening.apply(change @ coefficients) / (2 * step[index]))
        return np.stack(columns, axis=1) if columns else np.empty((len(self.whitening.matrix), 0))

    def _descend(self, target: Vector, start: Vector) -> "Solution":
        def residuals(theta: Vector) -> Vector:
            return self.projected(theta, target)[0]

        def jacobian(theta: Vector) -> Matrix:
            _, coefficients, q = self.projected(theta, target)
            slopes = self.slopes(theta, coefficients)
            return np.asarray(q @ (q.T @ slopes) - slopes)

        inside = np.clip(start, self.lower + 1e-9 * self.typical, self.upper - 1e-9 * self.typical)
        if np.linalg.norm(residuals(inside)) <= _EXACT * np.linalg.norm(target):
            return self._at(inside, target, True)  # as many parameters as points: nothing to search for
        bounds = (self.lower, self.upper)
        with np.errstate(divide="ignore", invalid="ignore"):  # in directions that the data leave quite open
            found = least_squares(
                residuals, inside, jacobian, bounds, x_scale=self.typical, xtol=1e-11, ftol=1e-11, gtol=None
            )
        return self._at(np.asarray(found.x), target, bool(found.status > 0))

    def _at(self, theta: Vector, target: Vector, converged: bool) -> "Solution":
        residuals, coefficients, _ = self.projected(theta, target)
        return Solution(self, theta, coefficients, residuals, converged)


@dataclass(frozen=True, eq=False)
class Solution:
    """A minimum: theta [m], coefficients [k], whitened residuals [n]."""

    problem: Problem
    theta: Vector
    coefficients: Vector
    residuals: Vector
    converged: bool

    @property
    def chi2(self) -> float:
        """Sum of squared whitened residuals."""
        return float(self.residuals @ self.residuals)

    @cached_property
    def jacobian(self) -> Matrix:
        """Whitened derivative of the model by all parameters [n, m + k], theta first."""
        design = self.problem.whitening.apply(self.problem.design(self.theta))
        return np.hstack([self.problem.slopes(self.theta, self.coefficients), design])

    @cached_property
    def covariance(self) -> Matrix:
        """Covariance [m + k, m + k] of theta and coefficients, if the errors of the points are right."""
        scale = np.linalg.norm(self.jacobian, axis=0)
        scale[scale == 0] = 1.0
        inverse = np.linalg.pinv(self.jacobian / scale, rcond=1e-12)
        return np.asarray(inverse @ inverse.T / np.outer(scale, scale))

    @property
    def condition(self) -> float:
        """Condition number of the scaled Jacobian: large where the data do not determine the parameters."""
        scale = np.linalg.norm(self.jacobian, axis=0)
        if (scale == 0).any() or not np.isfinite(self.jacobian).all():
            return float("inf")
        return float(np.linalg.cond(self.jacobian / scale))

    def at_bound(self) -> list[int]:
        """Which of theta ended at a bound of its range."""
        near = 1e-6 * self.problem.typical
        theta, problem = self.theta, self.problem
        return np.flatnonzero((theta < problem.lower + near) | (theta > problem.upper - near)).tolist()

    @cached_property
    def _response(self) -> Matrix:
        """By how much theta moves per whitened residual, [m, n]: the inverse of the projected slopes here."""
        q, _ = np.linalg.qr(self.problem.whitening.apply(self.problem.design(self.theta)))
        slopes = self.problem.slopes(self.theta, self.coefficients)
        return np.asarray(np.linalg.pinv(slopes - q @ (q.T @ slopes)))

    def refit(self, y: Vector) -> tuple[Vector, Vector]:
        """Theta and coefficients for slightly other data: steps with the slopes found here, else the full search."""
        target = self.problem.whitening.apply(y)
        theta = self.theta
        settled = _SETTLED * np.sqrt(np.diag(self.covariance)[: len(theta)])
        for _ in range(_REFITS):
            residuals, coefficients, _ = self.problem.projected(theta, target)
            step = self._response @ residuals
            if (np.abs(step) <= settled).all():
                return theta, coefficients
            theta = theta + step
            if (theta <= self.problem.lower).any() or (theta >= self.problem.upper).any():
                break
        found = self.problem.solve(y, [self.theta])
        return found.theta, found.coefficients
