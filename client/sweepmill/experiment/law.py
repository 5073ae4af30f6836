"""The exact law of a number of random outcomes, from a stored histogram."""

from collections.abc import Callable
from dataclasses import dataclass
from typing import Self

import numpy as np
from numpy.typing import ArrayLike

from sweepmill.analysis.arrays import Vector
from sweepmill.analysis.estimate import Estimate

_RAREST = 0.01


@dataclass(frozen=True, eq=False)
class Law:
    """Integers [H], ascending, that occurred in so many [H] of the trajectories.

    `readings` counts how many integers were read off each trajectory: 1, or the layers of a unit cell.
    """

    values: Vector
    occurrences: Vector
    readings: int = 1

    @classmethod
    def of(cls, values: ArrayLike, occurrences: ArrayLike, trajectories: int | None = None) -> Self:
        """The law from the rows of a histogram. Raises ValueError where the rows are not those of so many trajectories.

        Without `trajectories`, each trajectory was read once.
        """
        numbers, counts = np.asarray(values, dtype=np.float64), np.asarray(occurrences, dtype=np.float64)
        order = np.argsort(numbers)
        total = int(counts.sum())
        if total < 2 or (trajectories is not None and (trajectories < 2 or total % trajectories)):
            raise ValueError(f"a histogram of {total} integers is not that of {trajectories} trajectories")
        return cls(numbers[order], counts[order], 1 if trajectories is None else total // trajectories)

    @property
    def trajectories(self) -> int:
        """Number of trajectories N."""
        return int(self.occurrences.sum()) // self.readings

    @property
    def deviation(self) -> float:
        """Standard deviation over trajectories."""
        shares = self.occurrences / self.occurrences.sum()
        return float((shares @ (self.values - shares @ self.values) ** 2) ** 0.5)

    def mean(self, function: Callable[[Vector], Vector] = lambda value: value) -> Estimate:
        """Mean of a function of the integer, with the error of N independent trajectories.

        The integers of one trajectory are taken as fully correlated, which cannot make the error too small.
        """
        results = function(self.values)
        shares = self.occurrences / self.occurrences.sum()
        mean = float(shares @ results)
        variance = float(shares @ (results - mean) ** 2) * self.trajectories / (self.trajectories - 1)
        return Estimate(mean, max(variance, 1.0 / self.trajectories) ** 0.5 / self.trajectories**0.5)

    def quantile(self, share: float) -> int:
        """The least integer that at least this share of the trajectories does not exceed."""
        below = np.cumsum(self.occurrences) >= share * self.occurrences.sum() * (1 - 1e-12)
        return int(self.values[int(np.argmax(below))])

    def log2_mean_power(self) -> tuple[Estimate, float]:
        """log2 of the mean of 2^r with its jackknife error, and the share that a hundredth of the trajectories carries.

        The jackknife leaves out one trajectory at a time (An Introduction to the Bootstrap (1993), chapter 11): the
        exact histogram has all replicas. The error is withheld where those few carry more than half.
        """
        top = self.values.max()
        powers = 2.0 ** (self.values - top)
        counts = self.occurrences / self.readings
        number, total = counts.sum(), float(counts @ powers)
        # of a single largest value nothing may be left: its replica is then that of the rest, however small
        replicas = np.log2(np.maximum(total - powers, 1e-300) / (number - 1))
        spread = float(counts @ (replicas - counts @ replicas / number) ** 2)
        few = _share_of_few(powers, counts)
        reason = f"a hundredth of the trajectories carries {few:.0%} of the mean" if few > 0.5 else ""
        error = ((number - 1) / number * spread) ** 0.5
        return Estimate(float(top + np.log2(total / number)), float(error), 0.0, reason), few


def _share_of_few(powers: Vector, counts: Vector) -> float:
    """Share of the sum that the largest hundredth carries; values ascending."""
    before = np.concatenate([np.cumsum(counts[::-1])[::-1][1:], [0.0]])
    taken = np.clip(_RAREST * counts.sum() - before, 0.0, counts)
    return float((taken @ powers) / (counts @ powers))
