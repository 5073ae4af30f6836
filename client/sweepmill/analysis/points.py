"""What every analysis starts from: means with their errors, where they belong, and what they rest on."""

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Self

import numpy as np
from numpy.typing import ArrayLike

from sweepmill.analysis.arrays import Mask, Matrix, Vector
from sweepmill.analysis.jackknife import jackknife_covariance, jackknife_error, replicas_from_folds
from sweepmill.analysis.selecting import keys_of, numbers, require_curves, require_finite
from sweepmill.errors import SharedTrajectories
from sweepmill.folds import Folds
from sweepmill.table import Table


@dataclass(frozen=True, eq=False)
class Points:
    """n measured means; build it with `Points.from_folds`, `Points.from_table` or `Points.of`.

    `sizes`, `x`, `mean`, `error` have shape [n]: system size, abscissa (a rate, a length, a time), mean and its
    standard error. `replicas` [F, n] are the means without fold r, in the same units. `keys` name the ensemble of
    every point (or are empty, without replicas): points of one ensemble are correlated, others are independent.
    """

    sizes: Vector
    x: Vector
    mean: Vector
    error: Vector
    replicas: Matrix | None = None
    keys: tuple[str, ...] = ()

    @classmethod
    def of(
        cls,
        sizes: ArrayLike,
        x: ArrayLike,
        mean: ArrayLike,
        error: ArrayLike,
        replicas: ArrayLike | None = None,
        keys: Sequence[str] = (),
    ) -> Self:
        """Points from anything array-like; sizes, x and errors are broadcast to the shape of the means.

        Raises ValueError for shapes that do not fit, values that are not finite, or errors that are not positive;
        SharedTrajectories if one ensemble is given twice for one size and abscissa.
        """
        means = np.atleast_1d(np.asarray(mean, dtype=np.float64))
        columns = [np.broadcast_to(np.asarray(one, dtype=np.float64), means.shape).copy() for one in (sizes, x, error)]
        table = None if replicas is None else np.asarray(replicas, dtype=np.float64)
        points = cls(columns[0], columns[1], means, columns[2], table, tuple(keys))
        points._check()
        return points

    @classmethod
    def from_table(cls, table: Table, x: str, sizes: str = "sites") -> Self:
        """The rows of a table of one observation, with the keys of their ensembles; without replicas.

        Raises KeyError for a column that is not there, ValueError as `of` does.
        """
        places = numbers(table, sizes), numbers(table, x)
        return cls.of(*places, table["mean"], table["standard_error"], None, keys_of(table))

    @classmethod
    def from_folds(cls, folds: Folds, x: str, sizes: str = "sites") -> Self:
        """The rows of one observation with jackknife replicas; x is any axis, `layer` or `position`.

        Means and standard errors are those of the table, from all trajectories. Raises ValueError where the rows are
        not one curve over x for each size (several layers or positions per ensemble where x is something else, or
        another axis that varies), saying what to choose; KeyError for a column that is not there.
        """
        places = numbers(folds, sizes), numbers(folds, x)
        require_curves(folds, x, sizes)
        require_finite(folds)
        replicas = replicas_from_folds(*folds.sums())
        return cls.of(*places, folds["mean"], folds["standard_error"], replicas, keys_of(folds))

    def _check(self) -> None:
        count = len(self.mean)
        if self.mean.ndim != 1 or count == 0:
            raise ValueError("points need one mean each, in one row")
        if not all(np.isfinite(column).all() for column in (self.sizes, self.x, self.mean, self.error)):
            raise ValueError("sizes, x, means and errors must be finite numbers")
        if (self.error <= 0).any():
            raise ValueError("every standard error must be positive: a sample that hardly varies has a bound, not 0")
        if self.replicas is not None and (self.replicas.ndim != 2 or self.replicas.shape[1] != count):
            raise ValueError(f"replicas must have shape [folds, {count}], got {list(self.replicas.shape)}")
        if self.replicas is not None and (len(self.replicas) < 4 or not np.isfinite(self.replicas).all()):
            raise ValueError("replicas need at least 4 folds and finite numbers")
        if self.replicas is not None and not self.keys:
            raise ValueError("replicas need the ensemble key of every point: it says which points are correlated")
        if self.keys and len(self.keys) != count:
            raise ValueError(f"one ensemble key per point: got {len(self.keys)} for {count} points")
        self._check_repeated()

    def _check_repeated(self) -> None:
        seen: set[tuple[str, float, float]] = set()
        for place in zip(self.keys, self.sizes.tolist(), self.x.tolist(), strict=False):  # no keys, nothing to check
            if place in seen:
                raise SharedTrajectories([place[0]])
            seen.add(place)

    def __len__(self) -> int:
        return len(self.mean)

    @property
    def ensembles(self) -> list[str]:
        """Keys of all ensembles, each once, sorted."""
        return sorted(set(self.keys))

    @property
    def folds(self) -> int:
        """Number of folds; 0 without replicas."""
        return 0 if self.replicas is None else len(self.replicas)

    @property
    def bounded(self) -> bool:
        """Whether the error of some point is a bound, larger than its replicas know of: they hardly vary."""
        return self.replicas is not None and bool((2 * jackknife_error(self.replicas) < self.error).any())

    def distinct_sizes(self) -> list[float]:
        """The sizes, each once, ascending."""
        return sorted(set(self.sizes.tolist()))

    def taken(self, keep: Mask) -> Self:
        """The points where `keep` [n] is true."""
        replicas = None if self.replicas is None else self.replicas[:, keep]
        keys = tuple(np.array(self.keys, dtype=object)[keep]) if self.keys else ()
        return type(self)(self.sizes[keep], self.x[keep], self.mean[keep], self.error[keep], replicas, keys)

    def thinned(self, most: int) -> Self:
        """At most so many points, spread evenly in the logarithm of x: few enough to be whitened."""
        order = np.argsort(self.x)
        wanted = np.geomspace(self.x[order[0]], self.x[order[-1]], most)
        nearest = {int(order[np.argmin(np.abs(np.log(self.x[order] / one)))]) for one in wanted}
        return self.taken(np.isin(np.arange(len(self)), sorted(nearest)))

    def with_mean(self, mean: Vector) -> Self:
        """Other means at the same places with the same errors."""
        return replace(self, mean=mean, replicas=None)

    def covariance(self) -> Matrix:
        """Covariance [n, n]: from the folds within an ensemble, zero between ensembles, diagonal without folds."""
        if self.replicas is None:
            return np.diag(self.error**2)
        covariance = jackknife_covariance(self.replicas)
        covariance[self.blocks()[:, None] != self.blocks()[None, :]] = 0.0
        alone = np.bincount(self.blocks(), minlength=len(self))[self.blocks()] == 1
        covariance[alone, alone] = self.error[alone] ** 2  # the error from all trajectories beats that of the folds
        return covariance

    def blocks(self) -> np.ndarray[tuple[int], np.dtype[np.int64]]:
        """Number of the group [n] of every point within which points are correlated: its ensemble."""
        if not self.keys:
            return np.arange(len(self))
        return np.asarray(np.unique(np.array(self.keys), return_inverse=True)[1], dtype=np.int64)
