"""The jackknife over folds: errors of anything that is computed from means of trajectories.

With F folds of independent trajectories, replica r leaves fold r out everywhere. The variance of a function of the
replicas is (F - 1)/F times its sum of squared deviations (An Introduction to the Bootstrap (1993), chapter 11).
"""

from collections.abc import Callable

import numpy as np

from sweepmill.analysis.arrays import Matrix, Vector


def replicas_from_folds(sums: Matrix, counts: Matrix) -> Matrix:
    """Means without one fold, shape [F, n], from the sums and trajectory numbers of the folds, both [F, n].

    Raises ValueError if leaving a fold out leaves nothing.
    """
    left = counts.sum(axis=0) - counts
    if (left <= 0).any():
        raise ValueError("every fold but one is empty: there is nothing to leave out")
    return np.asarray((sums.sum(axis=0) - sums) / left, dtype=np.float64)


def jackknife_covariance(replicas: Matrix) -> Matrix:
    """Covariance [n, n] of n quantities from their replicas [F, n]."""
    folds = len(replicas)
    deviations = replicas - replicas.mean(axis=0)
    return np.asarray((folds - 1) / folds * deviations.T @ deviations, dtype=np.float64)


def noise_variances(replicas: Matrix | None, inflation: float, linear: Callable[[], Vector], bounded: bool) -> Vector:
    """Variances [n] of fitted quantities by noise: jackknife times `inflation` squared, `linear` without replicas.

    The larger of both where the error of a point is a bound (`bounded`): replicas that do not vary tell of no error.
    """
    if replicas is None:
        return linear()
    found = np.asarray(np.diag(jackknife_covariance(replicas)) * inflation**2)
    return np.maximum(found, linear()) if bounded else found


def jackknife_error(replicas: Matrix) -> Vector:
    """Standard errors [n] of n quantities from their replicas [F, n]."""
    folds = len(replicas)
    return np.asarray(np.sqrt((folds - 1) * replicas.var(axis=0)), dtype=np.float64)
