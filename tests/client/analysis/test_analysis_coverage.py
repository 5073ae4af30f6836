"""Quoted one-sigma intervals of a collapse cover as they should, over synthetic replicates with fixed seeds."""

import numpy as np
import pytest
from scipy import stats

from sweepmill.analysis import Collapse, Points, fit_collapse, fit_model_free
from sweepmill.analysis.model_free_search import Search

SIZES = np.repeat([16.0, 32.0, 64.0], 9)
U = np.tile(np.linspace(-0.6, 0.6, 9), 3)
P_C, NU, Y_STAR, NOISE = 0.16, 1.3, -0.42, 0.005
X = P_C + U * SIZES ** (-1 / NU)
EXACT = Y_STAR - 0.8 * U + 0.3 * U**2 + 0.1 * U**3
TRUTH = {"p_c": P_C, "nu": NU, "y_star": Y_STAR}
FALSE_ALARM = 1e-6  # of every binomial bound below


def plain(generator: np.random.Generator) -> Points:
    return Points.of(SIZES, X, EXACT + NOISE * generator.standard_normal(27), NOISE)


def folded(generator: np.random.Generator) -> Points:
    folds = EXACT + NOISE * np.sqrt(32) * generator.standard_normal((32, 27))
    replicas = (folds.sum(axis=0) - folds) / 31
    return Points.of(SIZES, X, folds.mean(axis=0), NOISE, replicas, [f"{place:064d}" for place in range(27)])


def covered(results: list[Collapse], name: str) -> int:
    return sum(abs(one[name].sigmas_from(TRUTH[name])) < 1 for one in results if not one.flags)


def within(count: int, trials: int, lowest: float, highest: float) -> bool:
    """Whether a count is possible for some rate between the two, but for FALSE_ALARM."""
    return bool(
        stats.binom.sf(count - 1, trials, highest) > FALSE_ALARM
        and stats.binom.cdf(count, trials, lowest) > FALSE_ALARM
    )


@pytest.fixture(scope="module")
def results() -> list[Collapse]:
    """Fits of 200 replicates with known errors."""
    generator = np.random.default_rng(60)
    return [fit_collapse(plain(generator), drift=False) for _ in range(200)]


def test_statistical_errors_cover_in_two_thirds_of_replicates(results: list[Collapse]) -> None:
    # 0.683 for a Gaussian; errors are scaled by chi^2 where that is large, which makes it a little more
    right = [one for one in results if not one.flags]
    assert all(within(covered(results, name), len(right), 0.68, 0.73) for name in TRUTH)


def test_refused_fits_are_as_rare_as_promised(results: list[Collapse]) -> None:
    # one right fit in a hundred has a p-value below 0.01
    assert within(sum(bool(one.flags) for one in results), len(results), 0.0, 0.01)


def test_jackknife_errors_cover_as_well() -> None:
    # 32 folds know an error to 13 %, which takes about a hundredth off the rate
    generator = np.random.default_rng(61)
    results = [fit_collapse(folded(generator), drift=False) for _ in range(40)]
    right = [one for one in results if not one.flags]
    assert all(within(covered(results, name), len(right), 0.67, 0.69) for name in TRUTH)


def test_errors_with_the_spread_between_fits_cover_no_less_and_not_much_more() -> None:
    # the spread is never negative, so it can only widen; 0.83 would be errors wider by more than a third
    generator = np.random.default_rng(62)
    results = [fit_collapse(plain(generator)) for _ in range(24)]
    right = [one for one in results if not one.flags]
    assert all(within(covered(results, name), len(right), 0.68, 0.83) for name in TRUTH)


def test_errors_without_a_function_are_as_large_as_the_scatter_between_replicates() -> None:
    # 24 replicates know their scatter to 15 %, 64 halves an error to 9 %: 5 of both together
    generator = np.random.default_rng(63)
    search = Search.of(plain(generator), 0.0, "quality")
    scatter = float(np.std([search.from_grid(plain(generator).mean)[0] for _ in range(24)], ddof=1))
    assert fit_model_free(folded(generator))["p_c"].statistical == pytest.approx(scatter, rel=0.87)
