"""One fit of a scaling form to one choice of points: values, their noise, and what is wrong with it."""

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from sweepmill.analysis.arrays import Matrix, Vector
from sweepmill.analysis.goodness import ACCEPTABLE, Goodness, judge
from sweepmill.analysis.jackknife import noise_variances
from sweepmill.analysis.points import Points
from sweepmill.analysis.scaling import Frame, Scaling
from sweepmill.analysis.separable import STEP, Problem, Solution
from sweepmill.analysis.whitening import whiten

_CONDITION = 1e7  # beyond this the data leave a combination of parameters open


@dataclass(frozen=True, eq=False)
class Fitted:
    """A scaling form fitted once."""

    points: Points
    frame: Frame
    solution: Solution
    goodness: Goodness

    @classmethod
    def of(cls, points: Points, form: Scaling, starts: list[Vector] | None = None) -> "Fitted":
        """The best fit, from a grid of starting points unless some are given.

        Raises ValueError for fewer than two sizes, one value of p only, or fewer points than parameters.
        """
        if len(points.distinct_sizes()) < 2:
            raise ValueError("finite-size scaling needs at least two sizes")
        if np.ptp(points.x) == 0:
            raise ValueError("finite-size scaling needs more than one value of p")
        if len(points) < form.parameters():
            raise ValueError(f"{form.parameters()} free parameters need as many points, got {len(points)}")
        frame, whitening = Frame.of(form, points), whiten(points)
        problem = Problem(frame.design, whitening, *frame.bounds())
        solution = problem.solve(points.mean, starts or _best_starts(problem, frame, points.mean))
        return cls(points, frame, solution, judge(whitening, solution.residuals, solution.jacobian))

    @property
    def names(self) -> list[str]:
        """Names of the quantities reported, in the order of `values`."""
        free = self.frame.form.names()
        renamed = {"inverse_nu": "nu", "zeta_over_nu": "zeta"}
        return [renamed.get(name, name) for name in free] + (["y_star"] if self.frame.form.zeta == 0 else [])

    @cached_property
    def values(self) -> Vector:
        """The quantities reported: the free exponents and places, and f(0) as `y_star` where zeta is fixed at 0."""
        return self._report(self.solution.theta, self.solution.coefficients)

    def _report(self, theta: Vector, coefficients: Vector) -> Vector:
        named = self.frame.values(theta)
        reported = {**named, "nu": 1 / named["inverse_nu"], "zeta": named["zeta_over_nu"] / named["inverse_nu"]}
        reported["y_star"] = float(self.frame.at_criticality(theta) @ coefficients)
        return np.array([reported[name] for name in self.names])

    @cached_property
    def replicas(self) -> Matrix | None:
        """The reported quantities of every jackknife replica [F, quantities]; None without folds."""
        if self.points.replicas is None:
            return None
        return np.stack([self._report(*self.solution.refit(y)) for y in self.points.replicas])

    @cached_property
    def variances(self) -> Vector:
        """Variances of the reported quantities by noise."""
        inflation = self.solution.problem.whitening.inflation(self.frame.form.parameters())
        return noise_variances(self.replicas, inflation, lambda: self._linear, self.points.bounded)

    @property
    def _linear(self) -> Vector:
        gradient = self._gradient()
        return np.asarray(np.maximum(np.einsum("ij,jk,ik->i", gradient, self.solution.covariance, gradient), 0.0))

    def _gradient(self) -> Matrix:
        theta, coefficients = self.solution.theta, self.solution.coefficients
        columns = []
        for index, size in enumerate(self.solution.problem.typical):
            step = np.zeros_like(theta)
            step[index] = STEP * size
            change = self._report(theta + step, coefficients) - self._report(theta - step, coefficients)
            columns.append(change / (2 * step[index]))
        linear = np.zeros((len(self.values), len(coefficients)))
        if "y_star" in self.names:
            linear[self.names.index("y_star")] = self.frame.at_criticality(theta)
        return np.hstack([np.stack(columns, axis=1), linear])

    def faults(self, acceptable: float = ACCEPTABLE) -> list[str]:
        """Why no error may be quoted from this fit; empty where one may."""
        found = []
        if self.goodness.dof <= 0:
            found.append("no degrees of freedom are left, so nothing tests the form")
        elif self.goodness.p_value < acceptable:
            found.append(f"the form does not describe the data ({self.goodness})")
        edges = [self.frame.form.names()[index] for index in self.solution.at_bound()]
        found += [f"{name} ended at the edge of its range" for name in edges]
        if not self.solution.converged:
            found.append("the search did not converge")
        if not edges and self.solution.condition > _CONDITION:
            found.append("the data do not determine all parameters")
        return found

    def predicted(self, x: Vector, sizes: Vector) -> Vector:
        """The fitted y at other places."""
        return np.asarray(self.frame.design_at(self.solution.theta, x, sizes) @ self.solution.coefficients)

    def correction(self, x: Vector, sizes: Vector) -> Vector:
        """The part L^(-zeta/nu - omega) g(u) of the fitted y; zero where the form has none."""
        leading = self.frame.form.shape.coefficients
        design = self.frame.design_at(self.solution.theta, x, sizes)
        return np.asarray(design[:, leading:] @ self.solution.coefficients[leading:])

    def standardized(self) -> Vector:
        """(data - fit) / error of every point [n], not whitened."""
        fit = self.predicted(self.points.x, self.points.sizes)
        return np.asarray((self.points.mean - fit) / self.points.error)


def _best_starts(problem: Problem, frame: Frame, y: Vector, most: int = 2) -> list[Vector]:
    target = problem.whitening.apply(y)
    return sorted(frame.starts(), key=lambda start: float(np.sum(problem.projected(start, target)[0] ** 2)))[:most]
