"""How much one round may cost, and how its trajectories are shared out."""

from dataclasses import dataclass

import numpy as np

from sweepmill.analysis.arrays import Mask, Vector
from sweepmill.analysis.design.allocation import Informations, allocated, filled, variance
from sweepmill.analysis.design.place import Candidates

_FORM_SHARE = 0.1  # of a round tests the form
AIM = 0.95  # of the error asked for: the error found in the next round fluctuates
_GROWTH = 1.0  # core-seconds of a round per core-second spent so far
_NEW = 2  # new places per size and round at most
_WORTH = 0.98  # new places must shrink the variance by this factor
_STEPS = 12


@dataclass(frozen=True, eq=False)
class Plan:
    """Linearized fit at all candidates: information of one trajectory, the quantity as a direction, places by use.

    `usable` are the places within the window, `form` [n] >= 0 the shares by which the form is tested.
    """

    candidates: Candidates
    information: Informations
    direction: Vector
    usable: Mask
    form: Vector

    def variance(self, trajectories: Vector) -> float:
        """Variance of the quantity by the linearized fit."""
        return variance(self.information, self.direction, np.where(self.usable, trajectories, 0.0))

    def round(self, shrink: float) -> Vector:
        """Trajectories [n] after a round that makes the variance `shrink` times what it is, or comes nearer to that."""
        goal, most = self.variance(self.candidates.have) * shrink, _GROWTH * self.candidates.spent
        allowed = self._places(most)
        low, high = most / 4096, most
        if self.variance(self._shared(most, allowed)) < goal:
            for _ in range(_STEPS):
                middle = float(np.sqrt(low * high))
                enough = self.variance(self._shared(middle, allowed)) <= goal
                low, high = (low, middle) if enough else (middle, high)
        return self._opened(self._shared(high, allowed))

    def _places(self, budget: float) -> Mask:
        """Where trajectories may be added: new places are few, and there only if they pay."""
        placed = self.candidates.have > 0
        everywhere = self._shared(budget, np.ones(len(placed), dtype=bool))
        pay = self.variance(everywhere) < _WORTH * self.variance(self._shared(budget, placed))
        return self._few(everywhere) if pay else placed

    def _few(self, wanted: Vector) -> Mask:
        candidates = self.candidates
        allowed = candidates.have > 0
        for size in np.unique(candidates.size):
            fresh = np.flatnonzero((candidates.size == size) & (candidates.have == 0) & (wanted > 0))
            allowed[fresh[np.argsort(-wanted[fresh], kind="stable")][:_NEW]] = True
        return allowed

    def _opened(self, trajectories: Vector) -> Vector:
        """New places have as many trajectories as the others began with, or none."""
        candidates = self.candidates
        opening = np.minimum(candidates.opening, candidates.most)
        fresh = (candidates.have == 0) & (trajectories > 0)
        return np.where(
            fresh, np.where(trajectories < opening / 2, 0.0, np.maximum(trajectories, opening)), trajectories
        )

    def _shared(self, budget: float, allowed: Mask) -> Vector:
        candidates = self.candidates
        most = np.where(self.usable & (allowed | (self.form > 0)), candidates.most, candidates.have)
        tested = filled(self.form, candidates.cost, candidates.have, most, _FORM_SHARE * budget)
        open_ = np.where(allowed, most, tested)
        rest = budget - float((tested - candidates.have) @ candidates.cost)
        return allocated(self.information, self.direction, candidates.cost, tested, open_, rest)
