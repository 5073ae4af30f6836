"""A polynomial through the points of one size."""

from dataclasses import dataclass

import numpy as np
from numpy.polynomial.legendre import legder, legval, legvander
from scipy import stats

from sweepmill.analysis.arrays import Matrix, Vector


@dataclass(frozen=True, eq=False)
class LocalCurve:
    """A weighted polynomial fit on [low, high]; `smoother` [degree + 1, n] gives its coefficients from means [n]."""

    low: float
    high: float
    smoother: Matrix
    coefficients: Vector
    p_value: float

    @classmethod
    def of(cls, x: Vector, y: Vector, error: Vector, degree: int) -> "LocalCurve":
        """Fit points, all [n]; the degree is lowered where there are too few of them. Raises ValueError below 2."""
        if len(x) < 2:
            raise ValueError("a local curve needs at least two points")
        low, high = float(x.min()), float(x.max())
        design = legvander((2 * x - low - high) / (high - low), min(degree, len(x) - 1))
        smoother = np.linalg.pinv(design / error[:, None]) / error
        chi2, dof = float(np.sum(((y - design @ (smoother @ y)) / error) ** 2)), len(x) - design.shape[1]
        return cls(low, high, smoother, smoother @ y, float(stats.chi2.sf(chi2, dof)) if dof else 1.0)

    def through(self, y: Vector) -> "LocalCurve":
        """The same fit to other means [n]."""
        return LocalCurve(self.low, self.high, self.smoother, self.smoother @ y, self.p_value)

    def value(self, x: float) -> float:
        """The curve at x."""
        return float(legval((2 * x - self.low - self.high) / (self.high - self.low), self.coefficients))

    def slope(self, x: float) -> float:
        """Its derivative by x."""
        inner = legval((2 * x - self.low - self.high) / (self.high - self.low), legder(self.coefficients))
        return float(inner) * 2 / (self.high - self.low)
