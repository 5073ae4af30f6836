"""Averages of functions of integer values from exact histograms, such as the purity 2^-S."""

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from sweepmill.analysis.arrays import Matrix, Vector
from sweepmill.analysis.estimate import Estimate
from sweepmill.analysis.jackknife import jackknife_error, replicas_from_folds

_RAREST = 0.01


@dataclass(frozen=True, eq=False)
class Average:
    """A mean over trajectories with its error, its jackknife replicas [F], and how much of it rests on few.

    `from_few` is the share of the mean that the hundredth of trajectories with the largest values carries.
    """

    estimate: Estimate
    replicas: Vector
    from_few: float


def average_of(
    function: Callable[[NDArray[np.float64]], NDArray[np.float64]], values: ArrayLike, occurrences: ArrayLike
) -> Average:
    """Mean of function(value), from occurrences [H, F] of every value [H] in the folds of trajectories.

    The error is withheld where a hundredth of the trajectories carries more than half of the mean: a sample that
    small says little about an average dominated by rare trajectories. Raises ValueError without trajectories.
    """
    counts: Matrix = np.asarray(occurrences, dtype=np.float64)
    results = np.asarray(function(np.asarray(values, dtype=np.float64)), dtype=np.float64)
    sums = (results[:, None] * counts).sum(axis=0)[:, None]
    replicas = replicas_from_folds(sums, counts.sum(axis=0)[:, None])
    few = _share_of_few(np.abs(results), counts.sum(axis=1))
    reason = f"a hundredth of the trajectories carries {few:.0%} of the mean" if few > 0.5 else ""
    mean = float(sums.sum() / counts.sum())
    return Average(Estimate(mean, float(jackknife_error(replicas)[0]), 0.0, reason), replicas[:, 0], few)


def purity(values: ArrayLike, occurrences: ArrayLike) -> Average:
    """Mean of 2^-S from the histogram of an entropy in bits: the average purity of stabilizer states."""
    return average_of(lambda entropy: 2.0**-entropy, values, occurrences)


def _share_of_few(results: Vector, counts: Vector) -> float:
    order = np.argsort(-results)
    before = np.concatenate([[0.0], np.cumsum(counts[order])[:-1]])
    taken = np.clip(_RAREST * counts.sum() - before, 0.0, counts[order])
    return float((taken * results[order]).sum() / (counts * results).sum())
