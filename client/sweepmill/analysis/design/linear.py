"""A fit linearized: what one more trajectory anywhere tells about its parameters."""

from collections.abc import Callable
from dataclasses import replace

import numpy as np

from sweepmill.analysis.arrays import Matrix, Vector
from sweepmill.analysis.separable import STEP, Solution


def gradients(solution: Solution, predicted: Callable[[Solution], Vector]) -> Matrix:
    """Derivatives [n, m + k] of `predicted` [n] by theta and the coefficients, theta first."""
    columns = []
    for index, size in enumerate(solution.problem.typical):
        step = np.zeros_like(solution.theta)
        step[index] = STEP * size
        ahead, behind = (predicted(replace(solution, theta=solution.theta + sign * step)) for sign in (1, -1))
        columns.append((ahead - behind) / (2 * step[index]))
    for index in range(len(solution.coefficients)):
        unit = np.zeros_like(solution.coefficients)
        unit[index] = 1.0
        columns.append(predicted(replace(solution, coefficients=unit)))
    return np.stack(columns, axis=1)
