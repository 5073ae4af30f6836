"""The statistical tests of the suite share one false-alarm probability."""

import pytest

from support.budget import SHARES, TOTAL, chi_square_limit, z_limit


def test_the_shares_of_all_tests_stay_within_the_total() -> None:
    assert sum(SHARES.values()) <= TOTAL
    assert all(share > 0 for share in SHARES.values())


def test_a_limit_grows_with_the_number_of_comparisons() -> None:
    # two-sided normal quantile at 1e-4, from standard tables
    assert z_limit("pulls", 1) == pytest.approx(3.8906, abs=1e-4)
    assert z_limit("pulls", 100) > z_limit("pulls", 10) > z_limit("pulls", 1)


def test_the_chi_square_limit_of_one_degree_is_the_square_of_the_normal_one() -> None:
    assert chi_square_limit("pulls", 1, 1) == pytest.approx(z_limit("pulls", 1) ** 2)
