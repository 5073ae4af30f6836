"""How numbers with errors are written."""

import pytest

from sweepmill.analysis import Estimate
from sweepmill.analysis.estimate import with_error


@pytest.mark.parametrize(
    ("value", "error", "written"),
    [
        (0.15981, 0.0002, "0.1598(2)"),
        (1.2432, 0.031, "1.24(3)"),
        (1.2432, 0.0134, "1.243(13)"),
        (0.7859, 0.00099, "0.7859(10)"),
        (-3.02, 0.2, "-3.0(2)"),
        (1234.5, 30.0, "1230(30)"),
        (512.3, 2.0, "512(2)"),
        (17.2, 12.0, "17(12)"),
        (1e-7, 2e-9, "0.000000100(2)"),
    ],
)
def test_errors_stand_in_units_of_the_last_digits(value: float, error: float, written: str) -> None:
    assert with_error(value, error) == written


def test_both_parts_of_an_error_add_in_quadrature() -> None:
    assert Estimate(1.0, 0.3, 0.4).error == pytest.approx(0.5)


def test_a_withheld_error_is_neither_written_nor_given_nor_serialized() -> None:
    estimate = Estimate(1.0, 0.3, 0.4, "the form does not describe the data")
    assert estimate.error is None
    assert str(estimate) == "1 (no error bar)"
    assert estimate.to_dict()["statistical"] is None
    with pytest.raises(ValueError, match="does not describe"):
        estimate.sigmas_from(1.0)
