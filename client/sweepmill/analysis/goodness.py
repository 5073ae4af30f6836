"""Does a fit describe its data, and how much better than another."""

import math
from dataclasses import dataclass

import numpy as np
from scipy import stats

from sweepmill.analysis.arrays import Matrix, Vector
from sweepmill.analysis.whitening import Whitening

ACCEPTABLE = 0.01  # a fit with a smaller p-value does not describe its data: one good fit in a hundred is refused


@dataclass(frozen=True)
class Goodness:
    """chi^2 of a fit, its degrees of freedom and the probability of a larger one if the model is right.

    `chi2` and `dof` may be effective values where points are correlated; `kind` says how they were judged.
    """

    chi2: float
    dof: float
    p_value: float
    kind: str

    @property
    def ratio(self) -> float:
        """chi^2 per degree of freedom; nan where there is none."""
        return self.chi2 / self.dof if self.dof > 0 else math.nan

    def __str__(self) -> str:
        return f"chi2/dof = {self.chi2:.1f}/{self.dof:.4g}, p = {self.p_value:.2g}"


def judge(whitening: Whitening, residuals: Vector, jacobian: Matrix) -> Goodness:
    """Goodness of a fit from its whitened residuals [n] and whitened Jacobian [n, parameters]."""
    chi2, dof = float(residuals @ residuals), float(jacobian.shape[0] - jacobian.shape[1])
    if dof <= 0:
        return Goodness(chi2, dof, math.nan, "no degrees of freedom")
    if whitening.kind == "folds":
        return _hotelling(chi2, dof, whitening.folds - 1)
    if whitening.kind == "diagonal" and whitening.correlation is not None:
        return _scaled(chi2, whitening.correlation, whitening.folds - 1, jacobian)
    return Goodness(chi2, dof, float(stats.chi2.sf(chi2, dof)), "chi2")


def _hotelling(chi2: float, dof: float, covariance_dof: float) -> Goodness:
    """With an estimated covariance, chi^2 follows Hotelling's T^2 law (common practice)."""
    rest = covariance_dof - dof + 1
    p_value = float(stats.f.sf(chi2 * rest / (covariance_dof * dof), dof, rest))
    return Goodness(chi2 * (covariance_dof - dof - 1) / covariance_dof, dof, p_value, "Hotelling T2")


def _scaled(chi2: float, correlation: Matrix, covariance_dof: float, jacobian: Matrix) -> Goodness:
    """Unwhitened residuals: a scaled chi^2 law with the mean and variance that the correlations give it.

    tr(C^2) of a covariance estimated with f degrees of freedom is corrected for its noise (common practice).
    """
    q, _ = np.linalg.qr(jacobian)
    project = np.eye(len(jacobian)) - q @ q.T
    seen = project @ correlation @ project
    mean, f = float(np.trace(seen)), covariance_dof
    square = max(f * f / ((f + 2) * (f - 1)) * (float(np.sum(seen * seen)) - mean**2 / f), mean**2 / len(jacobian))
    scale = square / mean
    return Goodness(chi2 / scale, mean / scale, float(stats.chi2.sf(chi2 / scale, mean / scale)), "scaled chi2")


def information(whitening: Whitening, residuals: Vector, parameters: int) -> float:
    """AICc of a fit with so many free parameters; infinite where there are too few points for it.

    Minus twice the log-likelihood is chi^2 for known errors, and F ln(1 + chi^2/(F - 1)) for a covariance that was
    estimated from F folds (Parameter inference with estimated covariance matrices, MNRAS Letters 456, L132 (2016),
    from memory). Diagonal weights on correlated points count as fewer points.
    """
    chi2, count = float(residuals @ residuals), float(len(residuals))
    if whitening.kind == "folds":
        chi2 = whitening.folds * math.log1p(chi2 / (whitening.folds - 1))
    elif whitening.scale > 1:
        chi2, count = chi2 / whitening.scale, count / whitening.scale
    spare = count - parameters - 1
    return math.inf if spare <= 0 else chi2 + 2 * parameters + 2 * parameters * (parameters + 1) / spare


def weights(criteria: list[float]) -> list[float]:
    """Relative weights exp(-AICc/2), normalized; all 0 if none is finite."""
    best = min(criteria, default=math.inf)
    if math.isinf(best):
        return [0.0 for _ in criteria]
    raw = [math.exp(-(one - best) / 2) for one in criteria]
    return [one / math.fsum(raw) for one in raw]
