"""The projective Ising chain on a table of our own: p_c = 1/2 and nu = 4/3, the exact values of bond percolation.

Entanglement transition in the projective transverse field Ising model, Phys. Rev. B 102, 094204 (2020),
arXiv:2006.09748. The table is that of the example projective-ising-critical-point, 20,000 trajectories per ensemble.
With 64 folds a right program fails a comparison at 6.5 standard errors with probability 2e-8 (Student's law), and a
p-value with 1e-7: the share "published" of tests/support/budget.py.
"""

import numpy as np
import pytest

from support.stored import stored
from sweepmill.analysis import Points, Polynomial, Scaling, fit_collapse, fit_crossings

EXAMPLE = "projective-ising-critical-point"
SIGMAS, RARE = 6.5, 1e-7


def near(reach: float, *sizes: int) -> Points:
    """Tripartite information within |p - 1/2| L^(3/4) <= reach; of all sizes unless some are named."""
    points = stored(EXAMPLE).points("bond_rate", name="i3")
    keep = np.abs(points.x - 0.5) * points.sizes**0.75 <= reach
    return points.taken(keep & np.isin(points.sizes, sizes or points.distinct_sizes()))


@pytest.fixture(scope="module")
def corrected() -> Scaling:
    """With the correction that a boundary brings, 1/L; its function of u needs as much freedom as the data show."""
    return Scaling(Polynomial(4), corrected=True, omega=1.0, correction_degree=1)


def test_a_collapse_without_corrections_is_flagged_and_off() -> None:
    # crossings of I3 move by 0.02 between L = 16 and 64: a fit that quotes an error here is wrong
    result = fit_collapse(near(0.6), drift=False)
    assert "does not describe the data" in result.flags[0]
    assert result["p_c"].error is None
    assert result["p_c"].value < 0.498


def test_a_collapse_with_the_correction_of_a_boundary_finds_the_exact_values(corrected: Scaling) -> None:
    result = fit_collapse(near(0.45), corrected, RARE)
    assert not result.flags
    assert abs(result["p_c"].sigmas_from(0.5)) < SIGMAS
    assert abs(result["nu"].sigmas_from(4 / 3)) < SIGMAS
    assert (result["p_c"].error or 1.0) < 5e-4
    assert (result["nu"].error or 1.0) < 0.05


def test_the_exponent_of_the_correction_is_found_to_be_that_of_a_boundary() -> None:
    form = Scaling(Polynomial(5), corrected=True, omega=None, correction_degree=3)
    result = fit_collapse(near(0.6), form, RARE, drift=False)
    assert not result.flags
    for name, exact in (("p_c", 0.5), ("nu", 4 / 3), ("omega", 1.0)):
        assert abs(result[name].sigmas_from(exact)) < SIGMAS


def test_crossings_extrapolate_to_one_half() -> None:
    # they move as L^-(omega + 1/nu) = L^-7/4
    crossings = fit_crossings(near(1.0), degree=5, power=1.75, acceptable=RARE)
    assert not crossings.flags
    assert abs(crossings["p_c"].sigmas_from(0.5)) < SIGMAS
    assert crossings["p_c"].value == pytest.approx(0.5, abs=1e-3)
    assert all(abs(one.nu - 4 / 3) < SIGMAS * one.nu_error for one in crossings.table[1:])


@pytest.mark.parametrize(("row", "fold"), [(0, 5), (21, 63)])
def test_a_fold_of_the_table_sampled_again_gives_its_sum(row: int, fold: int) -> None:
    table = stored(EXAMPLE)
    assert table.specification.key == table.folds.metadata["sweep"]
    numerator, denominator = table.fold_again(row, fold)
    assert numerator == table.folds.values("numerators")[row][fold]
    assert denominator == table.folds.values("denominators")[row][fold]
