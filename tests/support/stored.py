"""Tables of fold sums kept in tests/golden/tables: sampled by this program, made by tests/golden/make_tables.py."""

import json
from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import Any

import numpy as np

import sweepmill
from sweepmill import Sweep
from sweepmill.analysis import Points, replicas_from_folds
from sweepmill.coordinates import coordinates
from sweepmill.sweep import Point
from sweepmill_worker.sample import sample

TABLES = Path(__file__).parents[1] / "golden" / "tables"
EXAMPLES = Path(sweepmill.__file__).parent / "examples" / "published"


@dataclass(frozen=True)
class Stored:
    """A table with one row per ensemble and observation."""

    example: str
    sweep: str
    rows: list[dict[str, Any]]

    def points(self, x: str, **where: Any) -> Points:
        """Points of the rows with the given values (several in a tuple), with errors and replicas from the folds."""
        rows = [row for row in self.rows if all(_is(row[name], value) for name, value in where.items())]
        sums = np.array([row["fold_sums"] for row in rows], dtype=np.float64).T / [row["scale"] for row in rows]
        folds = len(sums)
        counts = np.array([[len(range(fold, row["trajectories"], folds)) for row in rows] for fold in range(folds)])
        replicas = replicas_from_folds(sums, counts)
        deviations = replicas - replicas.mean(axis=0)
        error = np.sqrt((folds - 1) / folds * (deviations**2).sum(axis=0))
        mean = sums.sum(axis=0) / counts.sum(axis=0)
        sizes, places = ([row[name] for row in rows] for name in ("sites", x))
        return Points.of(sizes, places, mean, error, replicas, [row["ensemble"] for row in rows])

    def point(self, ensemble: str) -> Point:
        """The ensemble of that key, from the specification of the example."""
        return next(point for point in self.specification.points if point.ensemble.key == ensemble)

    @property
    def specification(self) -> Sweep:
        """The sweep that the table is of."""
        return Sweep.read(EXAMPLES / f"{self.example}.toml")

    def recomputed(self, row: dict[str, Any], fold: int) -> int:
        """The sum of one fold of a row, sampled again from the key of its ensemble and the numbers of trajectories."""
        ensemble = self.point(row["ensemble"]).ensemble
        observation = next(one.observation for one in self.specification.observations if one.name == row["name"])
        assert [place.scale for place in coordinates(ensemble, observation)] == [row["scale"]]
        members = range(fold, row["trajectories"], len(row["fold_sums"]))
        return sum(int(sample(ensemble, [observation], k, 1).accumulators[observation.key].sums[0, 0]) for k in members)


def _is(value: Any, wanted: Any) -> bool:
    return value in wanted if isinstance(wanted, tuple) else bool(value == wanted)


@cache
def stored(example: str) -> Stored:
    """The stored table of an example."""
    data = json.loads((TABLES / f"{example}.json").read_text())
    return Stored(data["example"], data["sweep"], data["rows"])
