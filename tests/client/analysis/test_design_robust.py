"""Advice where data are few, one-sided, wrong or of very different cost: never stuck, never more than it may."""

from collections.abc import Callable

import numpy as np
import pytest

from sweepmill.analysis import Points
from sweepmill.analysis.arrays import Vector
from sweepmill.analysis.design import Advice, Place, advise_critical_point
from sweepmill.analysis.design.ordering import bracket

P_C = 0.1611
Curve = Callable[[Vector, Vector], Vector]


def curve(size: Vector, x: Vector) -> Vector:
    u = (x - P_C) * size ** (1 / 1.3)
    return np.asarray(-0.42 + 0.5 * u - 0.15 * u**2 + 0.01 * u**3)


def candidates(sizes: list[float], grid: Vector, costs: list[float], cap: int = 10**6) -> list[Place]:
    pairs = zip(sizes, costs, strict=True)
    return [Place(size, float(x), cost, 0, cap) for size, cost in pairs for x in grid]


def advised(places: list[Place], starts: Vector, of: Curve = curve, count: int = 200, growth: float = 2.6) -> Advice:
    """Advice after `count` trajectories, of standard deviation 0.6, at the starting values of every size."""
    placed = [
        Place(one.size, one.x, one.cost, count if np.isclose(one.x, starts).any() else 0, one.at_most) for one in places
    ]
    on = [one for one in placed if one.trajectories]
    size, x = np.array([one.size for one in on]), np.array([one.x for one in on])
    folds = of(size, x) + 0.6 * np.sqrt(8 / count) * np.random.default_rng(0).standard_normal((8, len(on)))
    replicas, keys = (folds.sum(axis=0) - folds) / 7, [f"{index:064d}" for index in range(len(on))]
    points = Points.of(size, x, folds.mean(axis=0), 0.6 / np.sqrt(count), replicas, keys)
    advice = advise_critical_point(points, placed, 1e-3)
    have, targets = np.array([one.trajectories for one in placed]), np.array(advice.targets)
    cost = np.array([one.cost for one in placed])
    assert (targets >= have).all()
    assert (targets <= [one.at_most for one in placed]).all()
    assert targets @ cost <= growth * (have @ cost)
    assert advice.met or (targets > have).any()
    return advice


GRID = np.round(0.13 + 0.0025 * np.arange(25), 6)


def test_one_starting_value_is_followed_by_others_over_the_whole_range() -> None:
    places = candidates([16, 32], GRID, [1, 4])
    advice = advised(places, GRID[-1:], growth=8)
    assert advice.estimate.error is None
    assert "over the whole range" in advice.reason
    opened = {one.x for one, target in zip(places, advice.targets, strict=True) if target}
    assert len(opened) >= 3


def test_two_sizes_and_costs_that_differ_ten_thousandfold_are_taken() -> None:
    advice = advised(candidates([16, 32], GRID, [1e-4, 1.0]), GRID[::4], count=2000)
    assert abs(advice.estimate.value - P_C) < 0.02


def test_a_transition_outside_the_bounds_is_not_quoted() -> None:
    advice = advised(candidates([16, 32, 64], GRID + 0.06, [1, 4, 16]), GRID[::4] + 0.06, count=4000)
    assert advice.estimate.error is None


def test_curves_that_do_not_collapse_are_not_quoted_and_sampled_on_around_the_change_of_order() -> None:
    def shifted(size: Vector, x: Vector) -> Vector:
        return curve(size, x) + 0.3 * np.sin(size) * np.sin(200 * x)

    advice = advised(candidates([16, 32, 64], GRID, [1, 4, 16]), GRID[::3], shifted, count=20000)
    assert advice.estimate.error is None
    assert not advice.met


def test_hundreds_of_candidates_open_a_handful_of_new_values() -> None:
    fine = np.round(0.13 + 0.0005 * np.arange(121), 6)
    places = candidates([16, 32, 64, 128], fine, [1, 4, 16, 64])
    advice = advised(places, fine[::15], count=4000)
    opened = sum(target > 0 for target in advice.targets) - 9 * 4
    assert 0 <= opened <= 5 * 4 + 2 * 4
    assert abs(advice.estimate.value - P_C) < 0.01


def test_the_order_of_sizes_brackets_the_transition_and_says_nothing_where_it_does_not_change() -> None:
    x, size = np.tile(GRID[::4], 3), np.repeat([16.0, 32.0, 64.0], 7)
    found = bracket(Points.of(size, x, curve(size, x), 0.02))
    assert found is not None
    assert found.low < P_C < found.high
    assert bracket(Points.of(size, x, -size, 0.02)) is None


def test_points_must_be_the_places_with_trajectories() -> None:
    points = Points.of([16, 32], [0.13, 0.13], [0.1, 0.2], [0.1, 0.1])
    with pytest.raises(ValueError, match="in their order"):
        advise_critical_point(points, [Place(16, 0.13, 1, 10, 10), Place(32, 0.14, 1, 10, 10)], 1e-3)


def moving(size: Vector, x: Vector) -> Vector:
    """The same curve with a place of crossing that moves with the size."""
    return curve(size, x - 0.8 * size**-1.5)


def test_where_two_sizes_are_left_the_way_from_the_pair_before_counts_and_may_end_the_search() -> None:
    places = candidates([8, 16, 24], GRID, [1, 4, 9])
    placed = [Place(one.size, one.x, one.cost, 100_000, one.at_most) for one in places]
    size, x = np.array([one.size for one in placed]), np.array([one.x for one in placed])
    folds = moving(size, x) + 0.6 * np.sqrt(8 / 100_000) * np.random.default_rng(1).standard_normal((8, len(placed)))
    replicas, keys = (folds.sum(axis=0) - folds) / 7, [f"{index:064d}" for index in range(len(placed))]
    points = Points.of(size, x, folds.mean(axis=0), 0.6 / np.sqrt(100_000), replicas, keys)
    advice = advise_critical_point(points, placed, 1e-3)
    assert not advice.met
    assert advice.estimate.spread > 2e-3
    assert advice.targets == tuple(one.trajectories for one in placed)
    assert "larger sizes would help" in advice.reason
