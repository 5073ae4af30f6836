"""Linear maps that make the errors of points independent and of size one, as far as the folds allow."""

from dataclasses import dataclass
from typing import Literal

import numpy as np
from scipy import linalg

from sweepmill.analysis.arrays import Matrix, Vector
from sweepmill.analysis.points import Points

Kind = Literal["independent", "folds", "blocks", "diagonal"]


@dataclass(frozen=True, eq=False)
class Whitening:
    """A matrix [n, n] that whitens residuals, and what is known of it.

    `kind`: "independent" points; one ensemble whitened by its "folds"; several such "blocks"; or "diagonal", where
    the points of an ensemble are correlated and there are too few folds (or none) to whiten them.
    """

    matrix: Matrix
    kind: Kind
    folds: int
    correlation: Matrix | None = None
    note: str = ""

    @property
    def scale(self) -> float:
        """By how much correlations reduce the number of points that diagonal weights seem to have; at least 1."""
        if self.correlation is None:
            return 1.0
        return max(1.0, float(np.sum(self.correlation**2) / np.trace(self.correlation)))

    def inflation(self, parameters: int) -> float:
        """Factor on errors for weights that come from the same folds as the errors; 1 for other weights.

        With f degrees of freedom in the covariance and d = n - parameters, the variance found is low by (f - d)/f and
        the true one is larger by (f - 1)/(f - d - 1) than with the known covariance (multivariate analysis, common
        practice: both follow from the Wishart law).
        """
        if self.kind != "folds":
            return 1.0
        f, d = self.folds - 1, len(self.matrix) - parameters
        return float(np.sqrt(f * (f - 1) / ((f - d) * (f - d - 1)))) if d > 0 else 1.0

    def apply(self, values: Vector | Matrix) -> Matrix:
        """Whitened values: [n] or [n, k]."""
        return np.asarray(self.matrix @ values, dtype=np.float64)


def whiten(points: Points) -> Whitening:
    """The best whitening the points allow: by folds where an ensemble has at most half as many points as folds.

    More coordinates than that would leave a covariance too noisy to invert.
    """
    blocks = points.blocks()
    largest = int(np.bincount(blocks).max())
    if points.keys and points.replicas is None and largest > 1:
        return _diagonal(points, "points of one ensemble are correlated and no folds were given: chi2 is a guess")
    if largest == 1:
        return Whitening(np.diag(1 / points.error), "independent", points.folds)
    if largest > points.folds // 2:
        return _diagonal(points, f"{largest} points per ensemble on {points.folds} folds: weights are diagonal")
    if len(set(blocks.tolist())) == 1:
        return Whitening(_inverse_root(points.covariance()), "folds", points.folds)
    return _by_blocks(points)


def _diagonal(points: Points, note: str) -> Whitening:
    correlation = None
    if points.replicas is not None:
        correlation = points.covariance() / np.outer(points.error, points.error)
    return Whitening(np.diag(1 / points.error), "diagonal", points.folds, correlation, note)


def _by_blocks(points: Points) -> Whitening:
    covariance, blocks = points.covariance(), points.blocks()
    matrix = np.zeros_like(covariance)
    for block in set(blocks.tolist()):
        of = np.flatnonzero(blocks == block)
        unbiased = (points.folds - len(of) - 2) / (points.folds - 1) if len(of) > 1 else 1.0
        matrix[np.ix_(of, of)] = np.sqrt(unbiased) * _inverse_root(covariance[np.ix_(of, of)])
    return Whitening(matrix, "blocks", points.folds, note="several correlated ensembles: chi2 is approximate")


def _inverse_root(covariance: Matrix) -> Matrix:
    """W with W^T W = covariance^-1. Raises ValueError if the covariance is singular."""
    try:
        lower = linalg.cholesky(covariance, lower=True)
    except linalg.LinAlgError as error:
        raise ValueError("the points of an ensemble are linearly dependent: leave some out") from error
    return np.asarray(linalg.solve_triangular(lower, np.eye(len(lower)), lower=True), dtype=np.float64)
