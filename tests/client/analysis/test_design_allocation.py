"""The allocation of trajectories against a linear program for the same problem, and its limits."""

import numpy as np
import pytest
from scipy.optimize import linprog

from sweepmill.analysis.arrays import Vector
from sweepmill.analysis.design.allocation import allocated, filled, variance

SLOPES = np.random.default_rng(1).normal(size=(60, 5))
NOISE = np.random.default_rng(2).uniform(0.2, 5.0, 60)
COST = np.exp2(np.random.default_rng(3).integers(-3, 7, 60))
INFORMATION = SLOPES[:, :, None] * SLOPES[:, None, :] / NOISE[:, None, None]
NONE, ENDLESS = np.zeros(60), np.full(60, 1e12)


def least(cost: Vector, budget: float) -> float:
    """The least variance: sum |w| sqrt(variance x cost) squared over the budget, w unbiased (a linear program)."""
    weights = np.sqrt(NOISE * cost)
    found = linprog(np.tile(weights, 2), A_eq=np.hstack([SLOPES.T, -SLOPES.T]), b_eq=np.eye(5)[0])
    return float(found.fun or 0.0) ** 2 / budget


@pytest.mark.parametrize("cost", [COST, np.ones(60), np.geomspace(0.01, 100, 60)])
def test_the_variance_is_the_least_that_a_linear_program_finds(cost: Vector) -> None:
    found = allocated((INFORMATION,), 0, cost, NONE, ENDLESS, 1e6)
    assert found @ cost == pytest.approx(1e6)
    assert 1 - 1e-6 < variance(INFORMATION, 0, found) / least(cost, 1e6) < 1.02


def test_with_trajectories_and_caps_the_last_core_second_is_worth_the_same_everywhere() -> None:
    # the conditions of the minimum of a convex function between bounds (equivalence theorem, common practice)
    have, most = np.full(60, 50.0), np.full(60, 400.0)
    budget = 0.2 * float((most - have) @ COST)
    found = allocated((INFORMATION,), 0, COST, have, most, budget)
    assert (found - have) @ COST == pytest.approx(budget)
    solved = np.linalg.solve(np.tensordot(found, INFORMATION, 1), np.eye(5)[0])
    worth = (INFORMATION @ solved @ solved) / COST
    between, full = (found > have) & (found < most), found == most
    common = np.median(worth[between])
    np.testing.assert_allclose(worth[between], common, rtol=0.05)
    assert (worth[found == have] < 1.05 * common).all()
    assert (worth[full] > 0.95 * common).all()
    assert full.any()


def test_two_sizes_share_as_the_square_root_of_variance_over_cost() -> None:
    # a difference of two means: the classical allocation of two samples (common practice)
    slopes, noise, cost = np.array([[1.0, 0.0], [1.0, 1.0]]), np.array([1.0, 4.0]), np.array([1.0, 1e4])
    information = slopes[:, :, None] * slopes[:, None, :] / noise[:, None, None]
    found = allocated((information,), 1, cost, np.zeros(2), np.full(2, 1e9), 1e6)
    assert found[0] / found[1] == pytest.approx(np.sqrt(1.0 / 4.0 * 1e4), rel=1e-3)


def test_filling_spends_the_budget_or_reaches_every_cap() -> None:
    shape, have, most = np.array([1.0, 2.0, 0.0]), np.array([10.0, 0.0, 5.0]), np.array([20.0, 30.0, 9.0])
    cost = np.array([1.0, 3.0, 2.0])
    assert filled(shape, cost, have, most, 1e9).tolist() == [20.0, 30.0, 5.0]
    some = filled(shape, cost, have, most, 60.0)
    assert (some - have) @ cost == pytest.approx(60.0)
    assert some[2] == 5.0
