"""What a rule on a derived quantity is judged from, and what it says about the next round."""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from sweepmill.analysis.arrays import Vector
from sweepmill.analysis.estimate import Estimate


@dataclass(frozen=True)
class Place:
    """One candidate ensemble: system size, abscissa, core-seconds per trajectory, trajectories so far and at most.

    `trajectories` is 0 where nothing was sampled yet.
    """

    size: float
    x: float
    cost: float
    trajectories: int
    at_most: int

    def __post_init__(self) -> None:
        if not self.cost > 0:
            raise ValueError(f"a trajectory costs more than nothing, got {self.cost:g} core-seconds")
        if not 0 <= self.trajectories <= self.at_most:
            raise ValueError(f"{self.trajectories} trajectories are not between 0 and the cap of {self.at_most}")


@dataclass(frozen=True)
class Advice:
    """The quantity now, and the trajectories every place should have after the next round.

    `targets` are in the order of the places, never below what a place has; 0 leaves it out. `met` tells whether the
    error is as small as asked; if it is not and no target is above what there is, nothing more can be done.
    `predicted_error` is the standard error expected after the round (nan where there is no fit to tell it from).
    """

    estimate: Estimate
    met: bool
    targets: tuple[int, ...]
    predicted_error: float
    reason: str


@dataclass(frozen=True, eq=False)
class Candidates:
    """The places as columns, all [n]."""

    size: Vector
    x: Vector
    cost: Vector
    have: Vector
    most: Vector

    @classmethod
    def of(cls, places: Sequence[Place]) -> "Candidates":
        """Columns of the places."""
        rows = [(one.size, one.x, one.cost, one.trajectories, one.at_most) for one in places]
        return cls(*np.array(rows, dtype=np.float64).T)

    def __len__(self) -> int:
        return len(self.x)

    @property
    def opening(self) -> float:
        """Trajectories that a new place starts with: the fewest any has."""
        return float(self.have[self.have > 0].min())

    @property
    def spent(self) -> float:
        """Core-seconds so far."""
        return float(self.have @ self.cost)

    def opened(self, trajectories: Vector) -> Vector:
        """The same, but a new place has at least as many trajectories as the others began with, or none."""
        opening = np.minimum(self.opening, self.most)
        started = np.where(trajectories < opening / 2, 0.0, np.maximum(trajectories, opening))
        return np.where(self.have > 0, trajectories, started)
