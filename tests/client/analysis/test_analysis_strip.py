"""Finite-size scaling on exact data whose answers are known: the Ising strip.

Seeds are fixed; a right program fails a comparison at 5 standard errors, or a p-value, with probability below 1e-6.
"""

import json

import numpy as np
import pytest

from support.strip import CRITICAL, strip, strips
from sweepmill.analysis import NaturalSpline, Points, Polynomial, Scaling, fit_collapse, fit_crossings, fit_model_free

SIGMAS, RARE = 5.0, 1e-6


@pytest.mark.parametrize(
    ("size", "coupling", "value"),
    [
        (3, 0.43, 0.897372519141),
        (4, 0.46, 0.667597714988),
        (6, 0.43, 0.931718804241),
        (8, CRITICAL, 0.790673425),
        (64, CRITICAL, 0.785477064),
    ],
)
def test_the_strip_has_the_values_of_its_transfer_matrix(size: int, coupling: float, value: float) -> None:
    # digits from diagonalizing the transfer matrix by brute force, derived independently
    assert strip(size, coupling) == pytest.approx(value, abs=1e-9)


@pytest.mark.parametrize(
    ("size", "place"), [(4, 0.4383286768), (8, 0.4404380822), (16, 0.4406568935), (32, 0.4406830872)]
)
def test_crossings_of_a_size_and_its_double_are_those_of_the_exact_curves(size: int, place: float) -> None:
    # roots of y(2L, K) = y(L, K), derived independently
    couplings = np.tile(np.linspace(-0.04, 0.02, 9) / size + CRITICAL, 2)
    sizes = np.repeat([size, 2 * size], 9)
    means = [strip(int(n), k) for n, k in zip(sizes, couplings, strict=True)]
    (crossing,) = fit_crossings(Points.of(sizes, couplings, means, 1e-9), degree=6).table
    assert crossing.place == pytest.approx(place, abs=1e-9)
    assert not crossing.fault


def test_crossings_extrapolate_with_the_cube_of_the_size() -> None:
    # amplitude -0.1214 and power 3, derived independently
    crossings = fit_crossings(strips((16, 32, 64, 128, 256), 0.15, 3e-5, seed=1), 4, 3.0, acceptable=RARE)
    assert not crossings.flags
    assert abs(crossings["p_c"].sigmas_from(CRITICAL)) < SIGMAS
    assert abs(crossings["amplitude"].sigmas_from(-0.1214)) < SIGMAS
    assert crossings["p_c"].value == pytest.approx(CRITICAL, abs=5e-7)
    assert {what for what, _ in crossings.drift} >= {"without the smallest pair", "polynomials of degree 5"}


def test_crossings_extrapolated_with_a_wrong_power_are_flagged() -> None:
    crossings = fit_crossings(strips((16, 32, 64, 128, 256), 0.15, 3e-5, seed=1), degree=4, power=1.0)
    assert "does not describe the crossings" in crossings.flags[0]
    assert crossings["p_c"].error is None


def test_a_good_collapse_passes_with_the_right_answers() -> None:
    # an independent fit of such data (cubic, noise 1e-3) gave errors 2e-6, 0.0015, 4e-4 and chi2/dof 30.6/33
    result = fit_collapse(strips((32, 64, 128), 0.15, 1e-3, seed=11), acceptable=RARE)
    assert not result.flags
    assert result.goodness.dof == 33
    for name, exact in (("p_c", CRITICAL), ("nu", 1.0), ("y_star", np.pi / 4)):
        assert abs(result[name].sigmas_from(exact)) < SIGMAS
    assert result["p_c"].statistical == pytest.approx(2e-6, rel=0.2)
    assert result["nu"].statistical == pytest.approx(0.0015, rel=0.2)
    assert "p_c = 0.44068" in str(result)
    assert str(result).endswith("include the spread between fits.")


def test_a_collapse_too_far_from_the_transition_is_flagged_and_has_no_error_bar() -> None:
    # an independent fit of such data gave nu = 1.0108(9), 12 standard errors off, with chi2/dof 207/58
    result = fit_collapse(strips((16, 24, 32, 48, 64), 0.6, 2e-3, seed=12), Scaling(Polynomial(4)))
    assert result.goodness.dof == 58
    assert result.goodness.p_value < 1e-9
    assert "does not describe the data" in result.flags[0]
    assert result["nu"].error is None
    assert "no error bar" in str(result)
    assert "is not to be quoted" in str(result)
    assert json.loads(result.to_json())["estimates"]["nu"]["error"] is None


def test_a_spline_is_flagged_on_the_same_data() -> None:
    result = fit_collapse(strips((16, 24, 32, 48, 64), 0.6, 2e-3, seed=12), Scaling(NaturalSpline(7)), drift=False)
    assert result.flags


def test_a_nonlinear_scaling_field_repairs_that_fit() -> None:
    form = Scaling(Polynomial(5), nonlinear=True, corrected=True, omega=2.0)
    points = strips((24, 32, 48, 64), 0.6, 2e-3, seed=13)
    result = fit_collapse(points, form, acceptable=RARE, drift=False)
    assert not result.flags
    assert abs(result["nu"].sigmas_from(1.0)) < SIGMAS
    assert abs(result["p_c"].sigmas_from(CRITICAL)) < SIGMAS


def test_the_drift_table_tells_what_was_left_out_and_marks_fits_that_fail() -> None:
    result = fit_collapse(strips((16, 24, 32, 48, 64), 0.6, 2e-3, seed=12), Scaling(Polynomial(4)))
    whats = [row.what for row in result.drift]
    assert whats[:3] == ["L >= 24", "L >= 32", "L >= 48"]
    assert whats[-2:] == ["polynomial of degree 3", "polynomial of degree 5"]
    assert not result.drift[-2].accepted
    assert result.drift_text().splitlines()[0].split() == ["fit", "points", "p_c", "nu", "y_star", "chi2/dof", "p"]


def test_a_free_power_of_the_size_is_found_to_be_absent() -> None:
    # y has no scaling dimension: zeta = 0
    result = fit_collapse(strips((32, 64, 128), 0.15, 1e-3, seed=14), Scaling(zeta=None), drift=False)
    assert abs(result["zeta"].sigmas_from(0.0)) < SIGMAS
    assert abs(result["nu"].sigmas_from(1.0)) < SIGMAS


@pytest.mark.parametrize("measure", ["quality", "residual"])
def test_a_collapse_without_a_function_agrees(measure: str) -> None:
    result = fit_model_free(strips((32, 64, 128), 0.15, 1e-3, seed=15), measure=measure)  # type: ignore[arg-type]
    assert not result.flags
    assert measure == "residual" or result.value < 2.2  # mean 1.0, standard deviation 0.3 in 100 such data sets
    assert abs(result["p_c"].sigmas_from(CRITICAL)) < SIGMAS
    assert abs(result["nu"].sigmas_from(1.0)) < SIGMAS
    assert {one.what for one in result.windows} >= {"L >= 64"}


def test_curves_that_do_not_fall_on_one_are_flagged_without_a_function_too() -> None:
    result = fit_model_free(strips((16, 32, 64), 0.6, 2e-3, seed=17), measure="quality")
    assert "do not fall on one" in result.flags[0]
    assert result["nu"].error is None


def test_one_size_is_refused() -> None:
    with pytest.raises(ValueError, match="two sizes"):
        fit_collapse(strips((32,), 0.15, 1e-3))
    with pytest.raises(ValueError, match="two sizes"):
        fit_crossings(strips((32,), 0.15, 1e-3))


def test_more_parameters_than_points_are_refused() -> None:
    with pytest.raises(ValueError, match="6 free parameters"):
        fit_collapse(strips((32, 64), 0.15, 1e-3, count=2))


def test_a_transition_at_the_edge_of_the_data_is_flagged() -> None:
    points = strips((32, 64, 128), 0.15, 1e-3, seed=18)
    result = fit_collapse(points.taken(points.x > CRITICAL + 3e-4), drift=False)
    assert result.flags
