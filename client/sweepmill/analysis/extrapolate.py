"""From crossings of finite sizes to the critical point: p_c + a L^-power."""

import math

import numpy as np
from scipy import linalg

from sweepmill.analysis.arrays import Matrix, Vector
from sweepmill.analysis.crossing import Crossing
from sweepmill.analysis.estimate import Estimate
from sweepmill.analysis.goodness import Goodness, judge
from sweepmill.analysis.jackknife import jackknife_covariance
from sweepmill.analysis.separable import Problem, Solution
from sweepmill.analysis.whitening import Whitening

POWERS = (0.3, 8.0)


def extrapolate(
    error: Vector, crossings: list[Crossing], power: float | None, acceptable: float
) -> tuple[dict[str, Estimate], Goodness, tuple[str, ...]]:
    """Estimates of `p_c`, `amplitude` and, if free, `power`, by noise alone; the goodness; why errors are withheld.

    `error` [n] are the errors of the means that the crossings were found from; L is the smaller size of a pair.
    """
    solution = _solve(error, crossings, power)
    goodness = judge(solution.problem.whitening, solution.residuals, solution.jacobian)
    flags = _flags(solution, goodness, acceptable)
    variances = _variances(crossings, power, solution) * max(1.0, goodness.ratio if goodness.dof > 0 else 1.0)
    values = _report(crossings, power, solution.theta, solution.coefficients)
    estimates = {
        name: Estimate(float(value), math.sqrt(variance), 0.0, flags[0] if flags else "")
        for name, value, variance in zip(("p_c", "amplitude", "power"), values, variances, strict=False)
    }
    return estimates, goodness, flags


def _solve(error: Vector, crossings: list[Crossing], power: float | None) -> Solution:
    sizes = np.array([one.small for one in crossings])
    gradients = np.stack([one.gradient for one in crossings])
    lower = linalg.cholesky(gradients @ (error**2 * gradients).T, lower=True)
    inverse = np.asarray(linalg.solve_triangular(lower, np.eye(len(crossings)), lower=True))

    def design(theta: Vector) -> Matrix:
        return np.stack([np.ones_like(sizes), (sizes / sizes[0]) ** -(theta[0] if power is None else power)], axis=1)

    bounds = [np.array([bound]) if power is None else np.empty(0) for bound in (*POWERS, 1.0)]
    problem = Problem(design, Whitening(inverse, "independent", 0), bounds[0], bounds[1], bounds[2])
    return problem.solve(np.array([one.place for one in crossings]), [np.array([start]) for start in (1.0, 2.0, 3.5)])


def _report(crossings: list[Crossing], power: float | None, theta: Vector, coefficients: Vector) -> Vector:
    used = float(theta[0]) if power is None else power
    return np.array([coefficients[0], coefficients[1] * crossings[0].small ** used, *theta])


def _variances(crossings: list[Crossing], power: float | None, solution: Solution) -> Vector:
    replicas = [one.replicas for one in crossings if one.replicas is not None]
    if len(replicas) == len(crossings):
        refitted = [_report(crossings, power, *solution.refit(places)) for places in np.stack(replicas, axis=1)]
        return np.diag(jackknife_covariance(np.stack(refitted)))
    # p_c, amplitude and power depend on (theta, coefficients) by this gradient
    size, free = crossings[0].small, len(solution.theta)
    lift = size ** (float(solution.theta[0]) if power is None else power)
    gradient = np.zeros((2 + free, 2 + free))
    gradient[0, free], gradient[1, free + 1] = 1.0, lift
    if free:
        gradient[1, 0], gradient[2, 0] = solution.coefficients[1] * lift * math.log(size), 1.0
    return np.asarray(np.einsum("ij,jk,ik->i", gradient, solution.covariance, gradient))


def _flags(solution: Solution, goodness: Goodness, acceptable: float) -> tuple[str, ...]:
    if goodness.dof <= 0:
        return ("as many parameters as crossings, so nothing tests the extrapolation",)
    if goodness.p_value < acceptable:
        return (f"one power of L does not describe the crossings ({goodness})",)
    return ("the power ended at the edge of its range",) if solution.at_bound() else ()
