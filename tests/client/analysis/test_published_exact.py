"""Fits on what is known exactly: two-wall recursions and small percolation clusters. Nothing here depends on luck."""

import numpy as np
import pytest

from support.purity import purities
from support.rectangles import crossing_counts, crossing_probability
from support.walls import RATE, window_entropies
from sweepmill.analysis import Points, fit_growth, fit_laws


def test_the_recursion_of_a_finite_chain_grows_at_the_exact_velocity_until_its_ends_are_felt() -> None:
    # log2(5/4) = 0.321928094887 bits per layer (Operator spreading in random unitary circuits, Phys. Rev. X 8, 021014
    # (2018), arXiv:1705.08975); the half cut of 40 sites is crossed in even layers
    times = np.arange(2, 20, 2)
    growth = [-np.log2(purities(40, int(t))[0, 20]) for t in times]
    comparison = fit_growth(Points.of(40, times, growth, 1e-3))
    assert comparison.verdict == "linear"
    assert comparison["linear"]["v"].value == pytest.approx(0.321928094887, abs=1e-9)
    late = -np.log2(purities(40, 200)[0, 20])
    assert late == pytest.approx(20 - np.log2(2 / (1 + 2.0**-40)), abs=1e-2)  # (dA + dB)/(dA dB + 1): saturated


def test_windows_of_the_rotated_circuit_follow_the_walk_of_their_weights() -> None:
    # E[2^-S] of windows of 1, 3, 5, … slices is sum_h u_k(h) 2^-(2h+1), u a walk with weights .16, .32, .16 and .36 for
    # staying at 0: .5, .2, .092, .04544, .023456, .012482, derived independently; twice what the edge emits in as many
    # layers deep in the bulk of time
    u, found = np.array([1.0]), []
    for _ in range(400):
        found.append(float(u @ 2.0 ** -(2 * np.arange(len(u)) + 1)))
        u = _stepped(u)
    assert found[:6] == pytest.approx([0.5, 0.2, 0.092, 0.04544, 0.023456, 0.012482], abs=5e-7)
    windows = 2.0 ** -window_entropies(799)[::2]
    assert found == pytest.approx((2 * windows).tolist(), rel=1e-9)


def _stepped(u: np.ndarray) -> np.ndarray:
    padded = np.concatenate([[0.0], u, [0.0, 0.0]])
    stepped = 0.16 * padded[:-2] + 0.32 * padded[1:-1] + 0.16 * padded[2:]
    stepped[0] += 0.04 * u[0]
    return np.asarray(stepped)


def test_small_windows_are_far_from_the_law_and_the_fit_is_flagged() -> None:
    # local slopes from 11 and 41 slices on are still 0.439 and 0.365, against log2(5/4) = 0.3219 in the end
    widths = np.arange(3, 42, 4)
    comparison = fit_laws(Points.of(42, widths, window_entropies(41)[widths - 1], 0.01))
    slopes = np.diff(window_entropies(43)[::2]) / 2
    assert slopes[[5, 20]] == pytest.approx([0.439, 0.365], abs=1e-3)
    law = comparison["volume + logarithm"]
    assert law.faults
    assert law["s"].value > RATE + 0.02
    assert law["c_log2"].error is None


@pytest.mark.parametrize("n", [2, 3])
def test_self_dual_rectangles_cross_half_of_the_time_at_one_half(n: int) -> None:
    assert crossing_probability(n, 0.5) == 0.5
    assert sum(crossing_counts(n)) == 2 ** (len(crossing_counts(n)) - 2)


def test_the_crossing_probability_below_one_half_is_that_of_the_counts() -> None:
    # from an independent enumeration
    assert crossing_probability(3, 0.4) == pytest.approx(0.287709508403, abs=1e-12)
