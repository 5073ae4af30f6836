"""Distributions as they were counted: how often each value occurred, in every fold of trajectories."""

from collections.abc import Iterator
from dataclasses import dataclass, field
from typing import Any, Self

import numpy as np
from numpy.typing import ArrayLike

from sweepmill.analysis.arrays import Matrix, Vector
from sweepmill.analysis.estimate import Estimate
from sweepmill.analysis.jackknife import jackknife_error, replicas_from_folds
from sweepmill.table import BY_FOLD, Table
from sweepmill.text import cell
from sweepmill.values import Values

FOLDS = 64


@dataclass(frozen=True, eq=False)
class Distribution:
    """Occurrences [H, F] of the values [H], ascending, in F folds of trajectories; build it with `Distribution.of`.

    A trajectory is read once or several times (layers of a cell, translations): `readings` times. `key` is that of
    the ensemble, `place` tells the distribution from others, such as its axes.
    """

    values: Vector
    occurrences: Matrix
    trajectories: int
    key: str = ""
    place: dict[str, Any] = field(default_factory=dict)

    @classmethod
    def of(cls, values: ArrayLike, occurrences: ArrayLike, trajectories: int | None = None, **named: Any) -> Self:
        """From values [H] and occurrences [H, F]; without `trajectories`, each was read once.

        Raises ValueError for shapes that do not fit, values given twice, and occurrences that are no counts.
        """
        found, counts = np.asarray(values, dtype=np.float64), np.asarray(occurrences, dtype=np.float64)
        if counts.ndim != 2 or counts.shape[0] != len(found) or counts.shape[1] < 4:
            raise ValueError(f"occurrences must have shape [{len(found)}, folds], 4 folds at least, got {counts.shape}")
        if len(set(found.tolist())) < len(found):
            raise ValueError("a value is given twice")
        if (counts < 0).any() or not counts.sum() or (counts % 1).any():
            raise ValueError("occurrences are counts, and something must have occurred")
        order = np.argsort(found)
        number = round(counts.sum()) if trajectories is None else trajectories
        return cls(found[order], counts[order], number, **named)

    @classmethod
    def of_trajectories(cls, values: ArrayLike, **named: Any) -> Self:
        """From the values [n] of trajectories 0, 1, …"""
        found, index = np.unique(np.asarray(values, dtype=np.float64), return_inverse=True)
        occurrences = np.zeros((len(found), FOLDS))
        np.add.at(occurrences, (index, np.arange(len(index)) % FOLDS), 1)
        return cls.of(found, occurrences, **named)

    @property
    def counts(self) -> Vector:
        """Occurrences [H] over all folds."""
        return np.asarray(self.occurrences.sum(axis=1))

    @property
    def readings(self) -> float:
        """Readings of one trajectory."""
        return float(self.occurrences.sum() / self.trajectories)

    @property
    def shares(self) -> Vector:
        """Relative frequency [H] of each value."""
        return np.asarray(self.counts / self.occurrences.sum())

    @property
    def errors(self) -> Vector:
        """Standard errors [H] of the shares, by jackknife over the folds."""
        return jackknife_error(self.replicas())

    def replicas(self) -> Matrix:
        """Shares without one fold, [F, H]."""
        counts = self.occurrences.T
        return replicas_from_folds(counts, np.repeat(counts.sum(axis=1)[:, None], counts.shape[1], axis=1))

    def mean(self) -> Estimate:
        """Mean of the values."""
        replicas = self.replicas() @ self.values
        return Estimate(float(self.shares @ self.values), float(jackknife_error(replicas[:, None])[0]))

    @property
    def label(self) -> str:
        """What tells this distribution from others."""
        parts = (f"{name} = {cell(value)}" for name, value in self.place.items() if value is not None)
        return ", ".join(parts) or "all trajectories"


def distributions(table: Table) -> Iterator[Distribution]:
    """One for every ensemble, layer and position of a table of histograms by fold, of one observation.

    Raises ValueError for a table without folds or of several observations.
    """
    if BY_FOLD not in table:
        raise ValueError("histograms with their folds are needed: RemoteSweep.histograms(folds=True)")
    names = sorted(set(table.values("name")))
    if len(names) > 1:
        raise ValueError(f"choose one observation of {', '.join(names)}")
    varying = [*table.axes, *(name for name in ("layer", "position") if any(v is not None for v in table.values(name)))]
    for entry in table.ensembles:
        trajectories = entry["observations"][table.metadata["observations"][names[0]]]["trajectories"][1]
        groups: dict[tuple[Any, ...], list[int]] = {}
        for row in range(*entry["rows"]):
            groups.setdefault(tuple(table.values(name)[row] for name in varying), []).append(row)
        for where, rows in groups.items():
            values = [table.values("value")[row] for row in rows]
            folds = [table.values(BY_FOLD)[row] for row in rows]
            place = dict(zip(varying, where, strict=True))
            yield Distribution.of(values, folds, trajectories, key=str(entry["key"]), place=place)


def distributions_of_values(values: Values) -> Iterator[Distribution]:
    """One for every ensemble, layer and position of kept values. Raises ValueError for a ratio."""
    arrow = values.to_arrow()
    if "value" not in arrow.column_names:
        raise ValueError(f"{values.name} is a ratio: its numerators and denominators are in the kept values")
    for entry in values.ensembles:
        begin, end = entry["rows"]
        coordinates = len(values.metadata["scales"][entry["scales"]])
        for column in range(coordinates if end > begin else 0):
            here = {name: arrow[name][begin + column].as_py() for name in ("layer", "position")}
            place = entry["axes"] | {name: number for name, number in here.items() if number is not None}
            read = arrow["value"].slice(begin, end - begin).to_numpy().reshape(-1, coordinates)[:, column]
            yield Distribution.of_trajectories(read, key=str(entry["key"]), place=place)
