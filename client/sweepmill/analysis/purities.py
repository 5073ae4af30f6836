"""Mean purities of a sweep from its exact histograms, and the entropies -log2 of them."""

import json
import math
from collections.abc import Iterator
from dataclasses import dataclass
from itertools import groupby
from operator import itemgetter
from pathlib import Path
from typing import TYPE_CHECKING, Any

import numpy as np

from sweepmill.analysis.choosing import Choice, Chosen, chosen_rows
from sweepmill.analysis.estimate import Estimate
from sweepmill.analysis.histogram import Average, purity
from sweepmill.analysis.jackknife import jackknife_error
from sweepmill.analysis.points import Points
from sweepmill.analysis.selecting import keys_of, numbers
from sweepmill.table import BY_FOLD, Table
from sweepmill.text import aligned

if TYPE_CHECKING:
    from matplotlib.figure import Figure

ENTROPIES = ("entropy", "reference-entropy")  # quantities whose histograms count bits of entropy
_LEAST = 1e-12  # stands for the error of a sample that does not vary, which points may not have as 0


@dataclass(frozen=True, eq=False)
class Purities:
    """Mean purities 2^-S: `averages` in the order of `points`, whose means are -log2 of them (bits)."""

    name: str
    points: Points
    averages: tuple[Average, ...]

    @classmethod
    def of(cls, data: Chosen) -> "Purities":
        """From what `chosen_purities` gave."""
        return cls(data.of, data.points, tuple(average for _, average in _averages(data.table)))

    @property
    def entropies(self) -> tuple[Estimate, ...]:
        """-log2 of the mean purities, in bits."""
        rows = zip(self.points.mean, self.points.error, self.averages, strict=True)
        return tuple(Estimate(float(s), float(e), 0.0, one.estimate.withheld) for s, e, one in rows)

    def __str__(self) -> str:
        values = [one.estimate.value for one in self.averages]
        withheld = sum(bool(one.estimate.withheld) for one in self.averages)
        few = f"; {withheld} rest on so few trajectories that they have no error bar" if withheld else ""
        return (
            f"The mean purity 2^-S of {self.name} ({len(values)} points, from exact histograms) lies between "
            f"{min(values):.3g} and {max(values):.3g}; errors are jackknife over {self.points.folds} folds{few}."
        )

    def text(self) -> str:
        """All purities, one a line."""
        rows = [
            [f"{size:g}", f"{x:g}", str(one.estimate), str(entropy), f"{100 * one.from_few:.2g} %"]
            for size, x, one, entropy in self._rows()
        ]
        return aligned(["L", "x", "mean purity", "-log2 of it", "carried by the top 1 %"], rows)

    def _rows(self) -> Iterator[tuple[float, float, Average, Estimate]]:
        places = zip(self.points.sizes.tolist(), self.points.x.tolist(), strict=True)
        for (size, x), one, entropy in zip(places, self.averages, self.entropies, strict=True):
            yield size, x, one, entropy

    def to_dict(self) -> dict[str, Any]:
        """Everything as plain values, with the keys of the ensembles."""
        rows = [
            {"size": size, "x": x, "purity": one.estimate.to_dict(), "entropy": s.to_dict(), "from_few": one.from_few}
            for size, x, one, s in self._rows()
        ]
        head = {"analysis": "purity", "observation": self.name, "points": rows}
        return {**head, "folds": self.points.folds, "ensembles": self.points.ensembles}

    def to_json(self) -> str:
        """`to_dict` as JSON text."""
        return json.dumps(self.to_dict(), indent=1, allow_nan=False)

    def plot(self, path: str | Path | None = None, x_label: str = "x", y_label: str = "S") -> "Figure":
        """Mean purities and -log2 of them in one figure, written to `path` if given."""
        from sweepmill.analysis.plot_purities import plot_purities

        return plot_purities(self, path, x_label, y_label)


def mean_purities(histograms: Table, of: str | None = None, x: str | None = None) -> Purities:
    """Mean purities of an observation, from `RemoteSweep.histograms(folds=True)`, against any axis or position.

    Raises ValueError where no entropy keeps a histogram, or where the rows are not one curve for each size.
    """
    return Purities.of(chosen_purities(histograms, Choice(of, x)))


def chosen_purities(histograms: Table, choice: Choice, abscissae: tuple[str, ...] = ("position",)) -> Chosen:
    """Points of -log2 of the mean purity, from `RemoteSweep.histograms(folds=True)`; one row for each point.

    Raises ValueError where no entropy keeps a histogram, and as `chosen` does.
    """
    if not len(histograms):
        raise ValueError("no observation keeps a histogram: submit an entropy with histogram = true")
    rows, sizes, x = chosen_rows(histograms, choice, abscissae)
    quantity = rows.values("quantity")[0]
    if quantity not in ENTROPIES:
        raise ValueError(f"{quantity} is no entropy, so 2^-S means nothing: one of {', '.join(ENTROPIES)} is needed")
    found = list(_averages(rows))
    places = rows.taken([place for place, _ in found])
    replicas = -np.log2(np.stack([one.replicas for _, one in found], axis=1))
    mean = [-math.log2(one.estimate.value) for _, one in found]
    error = np.maximum(jackknife_error(replicas), _LEAST)
    columns = numbers(places, sizes), numbers(places, x)
    points = Points.of(*columns, mean, error, replicas, keys_of(places))
    return Chosen(rows, points, str(rows.values("name")[0]), x)


def _averages(rows: Table) -> Iterator[tuple[int, Average]]:
    """The first row of every place, and the mean purity there."""
    keys = keys_of(rows) or ("",) * len(rows)
    places = list(zip(keys, rows.values("layer"), rows.values("position"), strict=True))
    least = min(map(len, rows.values(BY_FOLD)))
    for _, group in groupby(enumerate(places), key=itemgetter(1)):
        of = [index for index, _ in group]
        values, by_fold = ([rows.values(name)[i] for i in of] for name in ("value", BY_FOLD))
        yield of[0], purity(values, np.reshape(by_fold, (len(of), -1, least)).sum(axis=1))
