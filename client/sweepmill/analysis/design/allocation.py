"""Where trajectories shrink the variance of one quantity most per core-second.

With z = M^-1 c, the variance c M^-1 c of the quantity c is least for given core-seconds when z I z per core-second is
the same wherever trajectories are added, M being the sum of the information I of all trajectories (the equivalence
theorem of optimum design of experiments; c-optimality after Optimum allocation in linear regression theory, Ann. Math.
Stat. 23, 255 (1952), both from memory).
"""

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from sweepmill.analysis.arrays import Matrix, Vector

Informations = NDArray[np.float64]  # [places, parameters, parameters], of one trajectory each

_STEPS = 120
_NOTHING = 1e-12  # of the largest share


def filled(shape: Vector, cost: Vector, have: Vector, most: Vector, budget: float) -> Vector:
    """Trajectories [n] proportional to `shape` but between `have` and `most`, with `budget` core-seconds added.

    What the places cost together is piecewise linear in the factor of proportion, with an edge wherever a place
    leaves `have` or meets `most`.
    """
    open_ = np.flatnonzero((shape > _NOTHING * shape.max()) & (most > have))
    trajectories = have.copy()
    if len(open_) == 0:
        return trajectories
    factors = np.concatenate([have[open_], most[open_]]) / np.tile(shape[open_], 2)
    slopes = np.concatenate([cost[open_] * shape[open_], -cost[open_] * shape[open_]])
    order = np.argsort(factors, kind="stable")
    edges, slope = factors[order], np.cumsum(slopes[order])
    spent = np.concatenate([[0.0], np.cumsum(slope[:-1] * np.diff(edges))])
    last = max(int(np.searchsorted(spent, budget, side="right")) - 1, 0)
    factor = edges[last]
    if last < len(edges) - 1 and slope[last] > 0:
        factor += (budget - spent[last]) / slope[last]
    trajectories[open_] = np.clip(factor * shape[open_], have[open_], most[open_])
    return trajectories


def variance(information: Informations, wanted: int, trajectories: Vector) -> float:
    """Variance of the parameter with number `wanted` with so many trajectories [n] at every place."""
    return float(_solved(_total(trajectories, information), wanted)[wanted])


def allocated(
    fits: Sequence[Informations], wanted: int, cost: Vector, have: Vector, most: Vector, budget: float
) -> Vector:
    """Trajectories [n], not whole, that make the variance of parameter `wanted` least after `budget` more core-seconds.

    With the informations for several fits it is the product of their variances that becomes least.
    The variance is the least of sum_i |w_i|^2/T_i over the weights w of linear estimators, convex in w and T together;
    minimizing over one and the other in turn goes down to the minimum.
    """
    room = np.flatnonzero(most > have)
    if budget <= 0 or len(room) == 0:
        return have
    fixed = [_total(have, one) - _total(have[room], one[room]) for one in fits]
    trajectories = have.copy()
    columns = cost[room], have[room], most[room]
    trajectories[room] = _grown([one[room] for one in fits], fixed, wanted, columns, budget)
    return trajectories


def _grown(
    fits: Sequence[Informations],
    fixed: Sequence[Matrix],
    wanted: int,
    columns: tuple[Vector, Vector, Vector],
    budget: float,
) -> Vector:
    """As `allocated` where all places have room; `fixed` [m, m] are the informations of the others."""
    cost, have, most = columns
    trajectories = np.minimum(have + budget / len(have) / cost, most)
    for _ in range(_STEPS):
        worth = np.zeros(len(have))
        for information, others in zip(fits, fixed, strict=True):
            solved = _solved(others + _total(trajectories, information), wanted)
            worth += np.maximum(information @ solved @ solved, 0.0) / solved[wanted]
        trajectories = filled(trajectories * np.sqrt(worth / cost), cost, have, most, budget)
    return trajectories


def _total(trajectories: Vector, information: Informations) -> Matrix:
    return np.asarray(np.tensordot(trajectories, information, 1))


def _solved(matrix: Matrix, wanted: int) -> Vector:
    """Row `wanted` of the inverse."""
    scale = np.sqrt(np.maximum(np.diag(matrix), 1e-300))
    scaled = matrix / np.outer(scale, scale) + 1e-13 * np.eye(len(matrix))  # singular where the places are too few
    return np.asarray(np.linalg.solve(scaled, np.eye(len(matrix))[wanted] / scale) / scale)
