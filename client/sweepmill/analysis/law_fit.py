"""One law fitted to one choice of points."""

import math
from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from sweepmill.analysis.arrays import Matrix, Vector
from sweepmill.analysis.goodness import ACCEPTABLE, Goodness, information, judge
from sweepmill.analysis.jackknife import noise_variances
from sweepmill.analysis.laws import Law, chord_length
from sweepmill.analysis.points import Points
from sweepmill.analysis.separable import Problem, Solution
from sweepmill.analysis.whitening import Whitening, whiten


@dataclass(frozen=True, eq=False)
class FittedLaw:
    """A law with its parameters at the least chi^2; `ring` is the circumference where logarithms take the chord."""

    points: Points
    law: Law
    ring: float | None
    solution: Solution
    goodness: Goodness

    @classmethod
    def of(
        cls,
        points: Points,
        law: Law,
        ring: float | None = None,
        near: float | None = None,
        whitening: Whitening | None = None,
    ) -> "FittedLaw":
        """The best fit, its exponent searched for from a grid or from `near`; `whitening` by the points unless given.

        Raises ValueError for fewer points than parameters, or x that is not positive.
        """
        if len(points) < law.parameters:
            raise ValueError(f"the law {law.name} needs at least {law.parameters} points, got {len(points)}")
        if (points.x <= 0).any():
            raise ValueError("laws are in logarithms and powers of x: it must be positive")
        whitening = whitening or whiten(points)
        low, high, typical = _range(law, points)
        problem = Problem(_design(law, points.x, ring), whitening, low, high, typical)
        starts = [np.array([near])] if near is not None else [np.array([g]) for g in _starts(law, points)]
        solution = problem.solve(points.mean, starts or [np.empty(0)])
        return cls(points, law, ring, solution, judge(whitening, solution.residuals, solution.jacobian))

    @property
    def names(self) -> list[str]:
        """Coefficients, the exponent, and `<name>_log2` for the coefficient of log2 x in place of ln x."""
        names = list(self.law.coefficients) + ([self.law.exponent.name] if self.law.exponent else [])
        return names + ([f"{self.law.logarithm}_log2"] if self.law.logarithm else [])

    @cached_property
    def values(self) -> Vector:
        """The parameters in the order of `names`."""
        return self._report(self.solution.theta, self.solution.coefficients)

    def _report(self, theta: Vector, coefficients: Vector) -> Vector:
        plain = [*coefficients, *theta]
        if self.law.logarithm:
            plain.append(coefficients[self.law.coefficients.index(self.law.logarithm)] * math.log(2))
        return np.array(plain)

    @cached_property
    def replicas(self) -> Matrix | None:
        """The parameters of every jackknife replica [F, parameters]; None without folds."""
        if self.points.replicas is None:
            return None
        return np.stack([self._report(*self.solution.refit(y)) for y in self.points.replicas])

    @cached_property
    def variances(self) -> Vector:
        """Variances of the parameters by noise."""
        inflation = self.solution.problem.whitening.inflation(self.law.parameters)
        return noise_variances(self.replicas, inflation, lambda: self._linear, self.points.bounded)

    @property
    def _linear(self) -> Vector:
        free = len(self.solution.theta)
        found = np.diag(self.solution.covariance)
        return self._report(found[:free], found[free:]) * np.where(
            np.char.endswith(self.names, "_log2"), math.log(2), 1
        )

    @property
    def information(self) -> float:
        """AICc on whitened residuals."""
        return information(self.solution.problem.whitening, self.solution.residuals, self.law.parameters)

    @property
    def exponent(self) -> float | None:
        """The exponent, where the law has one."""
        return float(self.solution.theta[0]) if len(self.solution.theta) else None

    @property
    def at_edge(self) -> bool:
        """Whether the exponent ended at the edge of its range: the law is then another one in disguise."""
        return bool(self.solution.at_bound())

    def faults(self, acceptable: float = ACCEPTABLE) -> list[str]:
        """Why no error may be quoted from this fit; empty where one may."""
        found = []
        if self.goodness.dof <= 0:
            found.append("no degrees of freedom are left, so nothing tests the law")
        elif self.goodness.p_value < acceptable:
            found.append(f"it does not describe the data ({self.goodness})")
        if self.at_edge and self.law.exponent:
            found.append(f"{self.law.exponent.name} ended at the edge of its range")
        return found

    def predicted(self, x: Vector) -> Vector:
        """The fitted law at other places."""
        return np.asarray(_design(self.law, x, self.ring)(self.solution.theta) @ self.solution.coefficients)


def _design(law: Law, x: Vector, ring: float | None) -> Callable[[Vector], Matrix]:
    r = chord_length(x, ring)

    def design(theta: Vector) -> Matrix:
        return np.stack(law.terms(x, r, float(theta[0]) if len(theta) else 0.0), axis=1)

    return design


def _range(law: Law, points: Points) -> tuple[Vector, Vector, Vector]:
    if law.exponent is None:
        return np.empty(0), np.empty(0), np.empty(0)
    unit = 1 / float(points.x.max()) if law.exponent.per_x else 1.0
    low, high = law.exponent.low * unit, law.exponent.high * unit
    return np.array([low]), np.array([high]), np.array([unit if law.exponent.per_x else 0.2])


def _starts(law: Law, points: Points) -> list[float]:
    if law.exponent is None:
        return []
    unit = 1 / float(points.x.max()) if law.exponent.per_x else 1.0
    return [unit * start for start in law.exponent.grid()]
