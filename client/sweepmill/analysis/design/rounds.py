"""How much one round may cost, and how its trajectories are shared out."""

from dataclasses import dataclass

import numpy as np

from sweepmill.analysis.arrays import Mask, Vector
from sweepmill.analysis.design.allocation import Informations, allocated, filled, variance
from sweepmill.analysis.design.place import Candidates

_FORM_SHARE = 0.1  # of a round tests the form
AIM = 0.95  # of the error asked for: the error found in the next round fluctuates
_GROWTH = 1.0  # core-seconds of a round per core-second spent so far
_NEW = (-np.sqrt(1.5), 0.0, np.sqrt(1.5))  # places of three equal shares with mean 0 and width 1
_WORTH = 0.98  # new places must shrink the variance by this factor
_STEPS = 12


@dataclass(frozen=True, eq=False)
class Plan:
    """Linearized fit at all candidates: information of one trajectory, which parameter is wanted, places by use.

    `cautious` are the informations for a richer function, by which trajectories are placed: an optimum for the function
    as fitted would lean on its shape. `usable` are the places within the window, `inner` those that trajectories for
    the value itself may go to, `form` [n] >= 0 the shares by which the form is tested.
    """

    candidates: Candidates
    information: Informations
    cautious: tuple[Informations, ...]
    wanted: int
    usable: Mask
    inner: Mask
    form: Vector

    def variance(self, trajectories: Vector) -> float:
        """Variance of the quantity by the linearized fit."""
        return variance(self.information, self.wanted, np.where(self.usable, trajectories, 0.0))

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
        found = self.candidates.opened(self._shared(high, allowed))
        if (found > self.candidates.have).any():
            return found
        placed = self.candidates.have > 0  # a new place is more than this round is worth
        return np.where(placed, self._shared(high, placed), 0.0)

    def _places(self, budget: float) -> Mask:
        """Where trajectories may be added: new places are few, and there only if they pay."""
        placed = self.candidates.have > 0
        everywhere = self._shared(budget, np.ones(len(placed), dtype=bool))
        pay = self.variance(everywhere) < _WORTH * self.variance(self._shared(budget, placed))
        return self._few(everywhere) if pay else placed

    def _few(self, wanted: Vector) -> Mask:
        """The old places and, for every size, the three nearest to abscissas with the mean and width of what it gets.

        The optimum is flat: neighbors share what one of them could have, while the width matters.
        """
        candidates = self.candidates
        allowed, more = candidates.have > 0, np.where(self.inner, wanted - candidates.have, 0.0)
        for size in np.unique(candidates.size):
            of = np.flatnonzero((candidates.size == size) & self.usable)
            if more[of].sum() > 0:
                mean = np.average(candidates.x[of], weights=more[of])
                width = np.sqrt(np.average((candidates.x[of] - mean) ** 2, weights=more[of]))
                for place in mean + width * np.array(_NEW):
                    allowed[of[np.argmin(np.abs(candidates.x[of] - place))]] = True
        return allowed

    def _shared(self, budget: float, allowed: Mask) -> Vector:
        candidates = self.candidates
        most = np.where(self.usable, candidates.most, candidates.have)
        tested = filled(self.form, candidates.cost, candidates.have, most, _FORM_SHARE * budget)
        open_ = np.where(allowed & self.inner, most, tested)
        rest = budget - float((tested - candidates.have) @ candidates.cost)
        counted = np.where(self.usable, tested, 0.0)  # what lies outside the window tells the fit nothing
        most = np.where(self.usable, open_, 0.0)
        grown = allocated(self.cautious, self.wanted, candidates.cost, counted, most, rest)
        return np.where(self.usable, grown, candidates.have)
