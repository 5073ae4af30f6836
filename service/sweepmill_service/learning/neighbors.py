"""Regression on what is alike: a Gaussian process on logarithmic residuals against a rough prediction.

Residuals are taken to be sums of parts that cases share: one for each name they have in common, with a prior size of
its own, and one that fades with the distance of their places.  With nothing known the prediction is 0 with the prior's
scatter; near known cases it is their mean with little.  Outliers count less (weights of Student's t), and the scatter
is rescaled by what each known case misses when it is predicted from the others.  (Common practice.)
"""

import math
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]
FREEDOM: Final = 4.0
"""Degrees of freedom of the distribution that outliers are weighed by."""
ROUNDS: Final = 3
MOST_DOUBT: Final = 4.0
"""By how much the variance of an outlier is enlarged, at most: what is measured is hardly ever wrong."""
TRUST: Final = 10.0
"""How many known cases it takes until their own scatter outweighs the prior's."""
FARTHEST: Final = 9.0
"""No case counts as further away than this, in squared deviations."""
SCALES: Final = (0.7, 3.0)
"""Bounds of the factor by which the prior's scatter is rescaled."""


class Law(NamedTuple):
    """Prior standard deviations: of what cases with the same name share, level by level, and of what near ones do."""

    shared: tuple[float, ...]
    local: float
    together: int
    """The level whose name near ones must share."""


@dataclass(frozen=True)
class Cases:
    """Some cases: names [n, levels], how much of each level applies [n, levels], places [n, d] in lengths of memory."""

    names: Sequence[tuple[str, ...]]
    shares: Floats
    places: Floats

    def __len__(self) -> int:
        return len(self.names)

    def codes(self) -> NDArray[np.int64]:
        """Names as numbers, the same for the same name within a process."""
        levels = self.shares.shape[1]
        return np.array([[hash(name) for name in row] for row in self.names], dtype=np.int64).reshape(-1, levels)


def covariance(law: Law, one: Cases, other: Cases) -> Floats:
    """Prior covariance [n, m] of the residuals of two sets of cases."""
    a, b = one.codes(), other.codes()
    found = np.zeros((len(one), len(other)))
    for level, size in enumerate(law.shared):
        same = a[:, level, None] == b[None, :, level]
        found += size**2 * same * np.outer(one.shares[:, level], other.shares[:, level])
    alike = a[:, law.together, None] == b[None, :, law.together]
    lengths = (one.places**2).sum(axis=1)[:, None] + (other.places**2).sum(axis=1)[None, :]
    squares = np.maximum(lengths - 2 * one.places @ other.places.T, 0.0)
    near: Floats = law.local**2 * alike * np.exp(-squares / 2)
    return found + near


class Neighbors:
    """Residuals [n] of known cases with the variances [n] of their noise; no case at all is allowed."""

    def __init__(self, law: Law, cases: Cases, residuals: Floats, noise: Floats) -> None:
        self._law = law
        self._cases = cases
        self._weights: Floats = np.zeros(0)
        self._inverse: Floats = np.zeros((0, 0))
        self._noise: Floats = np.zeros(0)
        self.scale = 1.0
        """Factor of the scatter: more than 1 where known cases miss each other by more than the prior says."""
        if len(cases):
            self._learn(residuals, noise)

    def _learn(self, residuals: Floats, noise: Floats) -> None:
        prior = covariance(self._law, self._cases, self._cases)
        self._solve(prior, residuals, noise)
        for _ in range(ROUNDS):
            missed = self._missed(noise)
            self._solve(prior, residuals, noise * np.clip((FREEDOM + missed) / (FREEDOM + 1), None, MOST_DOUBT))
        alone = np.minimum(self._missed(noise), FARTHEST)
        self.scale = float(np.clip(np.sqrt((TRUST + alone.sum()) / (TRUST + len(alone))), *SCALES))

    def _solve(self, prior: Floats, residuals: Floats, noise: Floats) -> None:
        self._noise = noise
        self._inverse = np.asarray(np.linalg.inv(prior + np.diag(noise)), dtype=np.float64)
        self._weights = self._inverse @ residuals

    def _missed(self, noise: Floats) -> Floats:
        """Squared distance [n] of each known case from what the others predict, over its variance with such noise."""
        precisions = np.diag(self._inverse)
        missed: Floats = (self._weights / precisions) ** 2 / (1 / precisions - self._noise + noise)
        return missed

    def means(self, cases: Cases) -> Floats:
        """Predicted residuals [m]."""
        if not len(self._cases):
            return np.zeros(len(cases))
        predicted: Floats = covariance(self._law, cases, self._cases) @ self._weights
        return predicted

    def deviations(self, cases: Cases) -> Floats:
        """Standard deviation [m] of each prediction."""
        variances: Floats = cases.shares**2 @ np.square(self._law.shared) + self._law.local**2
        if len(self._cases):
            across = covariance(self._law, cases, self._cases)
            variances = variances - np.einsum("ij,jk,ik->i", across, self._inverse, across, optimize=True)
        found: Floats = self.scale * np.sqrt(np.maximum(variances, 0.0))
        return found

    def deviation_of_mean(self, cases: Cases, weights: Floats) -> float:
        """Standard deviation of the weighted mean of some predictions; weights [m] add up to 1."""
        variance = float(weights @ covariance(self._law, cases, cases) @ weights)
        if len(self._cases):
            across = weights @ covariance(self._law, cases, self._cases)
            variance -= float(across @ self._inverse @ across)
        return self.scale * math.sqrt(max(variance, 0.0))
