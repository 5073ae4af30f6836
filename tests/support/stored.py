"""Folds kept in tests/golden/tables, sampled by this program: `sweepmill folds` wrote them.

To make one again: sweepmill submit SPECIFICATION --watch; sweepmill folds KEY -o NAME.json. The specification stands
beside the file, or among the published examples of the package.
"""

from dataclasses import dataclass
from functools import cache
from pathlib import Path
from typing import Any

import sweepmill
from sweepmill import Sweep
from sweepmill.analysis import Points
from sweepmill.coordinates import coordinates
from sweepmill.folds import Folds
from sweepmill_worker.sample import sample

TABLES = Path(__file__).parents[1] / "golden" / "tables"
EXAMPLES = Path(sweepmill.__file__).parent / "examples" / "published"


@dataclass(frozen=True, eq=False)
class Stored:
    """Folds and the specification they are of."""

    folds: Folds
    specification: Sweep

    def points(self, x: str, **where: Any) -> Points:
        """Points of the rows with the given values (several in a tuple), with replicas."""
        return Points.from_folds(self.folds.where(**where), x)

    def fold_again(self, row: int, fold: int) -> tuple[float, float]:
        """Numerator and denominator of one fold of a row, sampled again from the key of its ensemble."""
        key = self._ensemble_of(row)
        ensemble = next(point.ensemble for point in self.specification.points if point.ensemble.key == key)
        name = self.folds.values("name")[row]
        observation = next(one.observation for one in self.specification.observations if one.name == name)
        ((scale,),) = ((place.scale for place in coordinates(ensemble, observation)),)
        folds, count = len(self.folds.values("numerators")[row]), self.folds.values("trajectories")[row]
        members = range(fold, count, folds)
        sums = (sample(ensemble, [observation], k, 1).accumulators[observation.key].sums for k in members)
        return sum(int(one[0, 0]) for one in sums) / scale, float(len(members))

    def _ensemble_of(self, row: int) -> str:
        return str(next(one["key"] for one in self.folds.ensembles if one["rows"][0] <= row < one["rows"][1]))


@cache
def stored(name: str) -> Stored:
    """The folds of that name."""
    beside = TABLES / f"{name}.toml"
    specification = Sweep.read(beside if beside.exists() else EXAMPLES / beside.name)
    return Stored(Folds.read(TABLES / f"{name}.json"), specification)
