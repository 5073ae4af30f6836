"""Do two distributions, or a distribution and an exact law, agree: chi^2 over values, rare ones put together."""

import math
from dataclasses import dataclass

import numpy as np
from scipy import stats

from sweepmill.analysis.arrays import Matrix, Vector
from sweepmill.analysis.distribution import Distribution
from sweepmill.analysis.jackknife import jackknife_covariance
from sweepmill.analysis.random_states import ExactLaw
from sweepmill.errors import SharedTrajectories

RARE = 5.0  # expected occurrences below which values are put together with their neighbors (common practice)
FOLDS_PER_BIN = 4  # a covariance of more bins than that cannot be estimated from the folds


@dataclass(frozen=True)
class Agreement:
    """chi^2 of the difference over `bins` groups of values, and the probability of a larger one if there is none.

    `impossible` is the number of occurrences of values that the exact law does not have: one is enough to refute it.
    """

    chi2: float
    dof: int
    p_value: float
    bins: int
    kind: str
    impossible: int = 0

    def __str__(self) -> str:
        if self.impossible:
            return f"{self.impossible} occurrences of values that the law does not have: p = 0"
        if self.dof == 0:
            return "only one value is frequent enough: nothing to compare"
        return f"chi2 = {self.chi2:.1f} with {self.dof} degrees of freedom, p = {self.p_value:.2g} ({self.kind})"


def against_law(found: Distribution, law: ExactLaw) -> Agreement:
    """Test a distribution against exact probabilities.

    Trajectories read once are counts of independent draws: Pearson's chi^2. Several readings of one trajectory are
    correlated; then the covariance of the shares comes from the folds, and Hotelling's T^2 is judged.
    """
    values = np.union1d(found.values, law.values)
    expected = _placed(law.values, law.probabilities, values)
    impossible = round(float(_placed(found.values, found.counts, values)[expected == 0].sum()))
    if impossible:
        return Agreement(math.inf, 1, 0.0, 1, "exact", impossible)
    groups = _groups(expected * found.trajectories, found)
    probabilities = _summed(expected, groups)
    if _independent(found):
        counts = _summed(_placed(found.values, found.counts, values), groups)
        wanted = probabilities * found.trajectories
        return _pearson(float(((counts - wanted) ** 2 / wanted).sum()), len(probabilities))
    shares, covariance = _in_groups(found, values, groups)
    return _hotelling(shares - probabilities, covariance, found.occurrences.shape[1] - 1)


def between(first: Distribution, second: Distribution) -> Agreement:
    """Test whether two distributions are samples of one law; as `against_law`, with the errors of both.

    Raises SharedTrajectories for two distributions of one ensemble.
    """
    if first.key and first.key == second.key:
        raise SharedTrajectories([first.key])
    both = (first, second)
    values = np.union1d(first.values, second.values)
    placed = [_placed(one.values, one.counts / one.readings, values) for one in both]
    number = sum(one.trajectories for one in both)
    smaller = min(one.trajectories for one in both)
    groups = _groups((placed[0] + placed[1]) * smaller / number, *both)
    if all(map(_independent, both)):
        table = np.stack([_summed(counts, groups) for counts in placed])
        wanted = table.sum(axis=1)[:, None] * table.sum(axis=0) / number
        return _pearson(float(((table - wanted) ** 2 / wanted).sum()), table.shape[1])
    (shares, covariance), (others, their) = (_in_groups(one, values, groups) for one in both)
    return _hotelling(shares - others, covariance + their, min(one.occurrences.shape[1] for one in both) - 1)


def _independent(one: Distribution) -> bool:
    return one.readings == 1


def _placed(values: Vector, numbers: Vector, among: Vector) -> Vector:
    """Numbers of some values among all; 0 for the others."""
    placed = np.zeros(len(among))
    placed[np.searchsorted(among, values)] = numbers
    return placed


def _groups(expected: Vector, *judged: Distribution) -> Vector:
    """Number of the group of each value: neighbors together until every group is frequent.

    Where covariances come from folds, a group is found in most of them, and there are far fewer groups than folds.
    """
    if all(map(_independent, judged)):
        return _grouped(expected, RARE)
    folds = min(one.occurrences.shape[1] for one in judged)
    threshold = max(RARE, float(folds))
    while (groups := _grouped(expected, threshold)).max() >= max(2, folds // FOLDS_PER_BIN):
        threshold *= 1.5
    return groups


def _grouped(expected: Vector, threshold: float) -> Vector:
    groups = np.zeros(len(expected))
    group, held = 0, 0.0
    for place, number in enumerate(expected):
        groups[place] = group
        held += number
        if held >= threshold and expected[place + 1 :].sum() >= threshold:
            group, held = group + 1, 0.0
    return groups


def _summed(numbers: Vector, groups: Vector) -> Vector:
    return np.asarray(np.bincount(groups.astype(np.int64), weights=numbers), dtype=np.float64)


def _in_groups(one: Distribution, values: Vector, groups: Vector) -> tuple[Vector, Matrix]:
    """Shares of the groups, and their covariance from the folds."""
    place = np.searchsorted(values, one.values)
    member = groups[place][:, None] == np.arange(groups.max() + 1)
    return one.shares @ member, jackknife_covariance(one.replicas() @ member)


def _pearson(chi2: float, bins: int) -> Agreement:
    p_value = float(stats.chi2.sf(chi2, bins - 1)) if bins > 1 else math.nan
    return Agreement(chi2, bins - 1, p_value, bins, "chi2")


def _hotelling(difference: Vector, covariance: Matrix, spare: int) -> Agreement:
    """The last share follows from the others; so many degrees of freedom have estimated the covariance."""
    bins, dof = len(difference), len(difference) - 1
    if dof == 0:
        return Agreement(0.0, 0, math.nan, bins, "Hotelling T2")
    squared = float(difference[:dof] @ np.linalg.solve(covariance[:dof, :dof], difference[:dof]))
    rest = spare - dof + 1
    p_value = float(stats.f.sf(squared * rest / (spare * dof), dof, rest))
    return Agreement(squared, dof, p_value, bins, "Hotelling T2")
