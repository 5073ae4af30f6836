"""Advice on a coefficient of an entanglement law, on synthetic data."""

import numpy as np
import pytest

from sweepmill.analysis import Points
from sweepmill.analysis.design import Advice, Place, advise_law

FOLDS = 32
SIZES = np.array([8.0, 16.0, 32.0, 64.0, 128.0])
COSTS = np.exp2([-14.0, -12.0, -10.0, -8.0, -6.0])


def advised(generator: np.random.Generator, have: np.ndarray, sums: np.ndarray, below: float, cap: int) -> Advice:
    keys = [f"{place:064d}" for place in range(len(SIZES))]
    total = sums.sum(axis=0)
    replicas = (total - sums) / (have * (1 - 1 / FOLDS))
    points = Points.of(SIZES, SIZES, total / have, 1.2 / np.sqrt(have), replicas, keys)
    places = [Place(s, s, c, int(n), cap) for s, c, n in zip(SIZES, COSTS, have, strict=True)]
    return advise_law(points, places, "logarithm", "a", below)


def rounds(seed: int, mean: np.ndarray, below: float, cap: int = 10**8) -> tuple[Advice, np.ndarray]:
    """Rounds until the rule is met or nothing is asked for any more, and the trajectories after them."""
    generator, have, sums = np.random.default_rng(seed), np.zeros(5), np.zeros((FOLDS, 5))
    targets = np.full(5, 200.0)
    while True:
        more = (targets - have) / FOLDS
        sums, have = sums + more * mean + 1.2 * np.sqrt(more) * generator.standard_normal(sums.shape), targets
        advice = advised(generator, have, sums, below, cap)
        targets = np.array(advice.targets, dtype=float)
        if advice.met or (targets <= have).all():
            return advice, have


def test_the_coefficient_of_a_logarithm_is_found_as_precisely_as_asked() -> None:
    advice, _ = rounds(7, 1.5 * np.log(SIZES) - 1, 0.02)
    assert advice.met
    assert advice.estimate.error is not None
    assert advice.estimate.error <= 0.02
    assert abs(advice.estimate.sigmas_from(1.5)) < 5  # chance of failure 6e-7


def test_where_no_choice_of_sizes_obeys_the_law_the_estimate_is_withheld_up_to_the_caps() -> None:
    advice, have = rounds(8, 0.1 * SIZES, 0.02, cap=2000)
    assert not advice.met
    assert advice.estimate.error is None
    assert "does not describe" in advice.estimate.withheld
    assert (have == 2000).all()


def test_sizes_that_break_the_law_are_left_out_and_get_no_more() -> None:
    mean = 1.5 * np.log(SIZES) - 1
    mean[0] += 2.0
    advice, have = rounds(9, mean, 0.02)
    assert abs(advice.estimate.sigmas_from(1.5)) < 5  # chance of failure 6e-7
    assert have[0] == 200


def test_ensembles_with_all_positions_grow_as_a_whole() -> None:
    generator, positions, count = np.random.default_rng(10), np.arange(2.0, 14.0), 500
    folds = 0.5 * np.log(positions) + 1 + 0.3 * generator.standard_normal((FOLDS, len(positions)))
    replicas = (folds.sum(axis=0) - folds) / (FOLDS - 1)
    error = folds.std(axis=0, ddof=1) / np.sqrt(FOLDS)
    points = Points.of(64.0, positions, folds.mean(axis=0), error, replicas, ["a" * 64] * len(positions))
    advice = advise_law(points, [Place(64.0, 1.0, 0.01, count, 10**6)], "logarithm", "a", 1e-3)
    assert advice.targets == (2 * count,)


def test_unknown_laws_and_coefficients_are_refused() -> None:
    points, places = Points.of([8, 16], [8, 16], [1, 2], [0.1, 0.1]), [Place(8, 8, 1, 9, 9), Place(16, 16, 1, 9, 9)]
    with pytest.raises(ValueError, match="no law is called"):
        advise_law(points, places, "cubic", "a", 0.1)
    with pytest.raises(ValueError, match="no coefficient 'z'"):
        advise_law(points, places, "logarithm", "z", 0.1)
