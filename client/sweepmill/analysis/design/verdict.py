"""What a round says, from the targets it found."""

import math

import numpy as np

from sweepmill.analysis.arrays import Vector
from sweepmill.analysis.design.place import Advice, Candidates
from sweepmill.analysis.design.rounds import AIM, Plan
from sweepmill.analysis.estimate import Estimate


def met(estimate: Estimate, name: str, candidates: Candidates, below: float) -> Advice | None:
    """The end, if the error is as small as asked; None if it is not."""
    if estimate.error is None or estimate.error > below:
        return None
    targets = tuple(int(one) for one in candidates.have)
    return Advice(estimate, True, targets, estimate.error, f"{name} = {estimate} is as precise as asked")


def improved(estimate: Estimate, name: str, candidates: Candidates, plan: Plan, below: float) -> Advice:
    """The round after which the error should be what was asked for, or as near to it as one round may come.

    All of the error is taken to shrink as that by noise does: the spread between fits is mostly noise while it does
    not stand out, and where it does, more data are what tells which points have to be left out. Where the error is
    withheld, the next round is as large as any.
    """
    error = math.hypot(estimate.statistical, estimate.spread)
    shrink = (AIM * below / error) ** 2
    targets = whole(plan.round(min(shrink, 0.5) if estimate.withheld else shrink), candidates)
    predicted = error * math.sqrt(plan.variance(targets) / plan.variance(candidates.have))
    state = f": {estimate.withheld}" if estimate.withheld else ""
    return told(estimate, targets, predicted, f"{name} = {estimate}, an error of {below:g} is asked{state}", candidates)


def told(estimate: Estimate, targets: Vector, predicted: float, reason: str, candidates: Candidates) -> Advice:
    """Advice that the rule is not met yet."""
    targets = whole(targets, candidates)
    if (targets <= candidates.have).all():
        reason += "; every ensemble that could help has all the trajectories it may have"
    return Advice(estimate, False, tuple(int(one) for one in targets), predicted, reason)


def whole(targets: Vector, candidates: Candidates) -> Vector:
    """Whole numbers of trajectories between those there are and the caps."""
    return np.asarray(np.clip(np.ceil(targets - 1e-6), candidates.have, candidates.most))
