"""The law of the random outcomes, birthdays over records, and numbers beyond floating point."""

import itertools
import math

import numpy as np
import pytest

from sweepmill.experiment import Law
from sweepmill.experiment.amounts import repetitions, wall_clock
from sweepmill.experiment.birthday import EXACT_UP_TO, asymptotic, exact, log2_until_repeated


def drawn(count: int = 200) -> list[int]:
    return list(np.random.default_rng(41).binomial(12, 0.4, size=count))


def law_of(integers: list[int], readings: int = 1) -> Law:
    values, counts = np.unique(integers, return_counts=True)
    return Law.of(values[::-1], counts[::-1], len(integers) // readings)


def test_a_law_has_the_moments_and_quantiles_of_the_integers_themselves() -> None:
    integers = drawn()
    law = law_of(integers)
    assert law.trajectories == 200
    assert law.mean().value == pytest.approx(np.mean(integers), rel=1e-14)
    assert law.mean().error == pytest.approx(np.std(integers, ddof=1) / 200**0.5, rel=1e-12)
    ordered = sorted(integers)
    assert [law.quantile(share) for share in (0.05, 0.5, 0.95)] == [ordered[9], ordered[99], ordered[189]]


def test_the_error_of_the_mean_power_is_the_jackknife_over_single_trajectories() -> None:
    integers = drawn()
    estimate, few = law_of(integers).log2_mean_power()
    powers = 2.0 ** np.array(integers)
    assert estimate.value == pytest.approx(math.log2(powers.mean()), rel=1e-14)
    replicas = np.log2((powers.sum() - powers) / 199)
    assert estimate.statistical == pytest.approx((199 * replicas.var()) ** 0.5, rel=1e-10)
    assert few == pytest.approx(np.sort(powers)[-2:].sum() / powers.sum(), rel=1e-12)


def test_a_mean_power_that_rests_on_few_has_no_error() -> None:
    estimate, few = Law.of([5, 60], [999, 1]).log2_mean_power()
    assert few > 0.99
    assert estimate.error is None
    assert "hundredth" in estimate.withheld


def test_powers_beyond_floating_point_are_no_obstacle() -> None:
    estimate, _ = Law.of([3000, 3001], [50, 50]).log2_mean_power()
    assert estimate.value == pytest.approx(3000 + math.log2(1.5), rel=1e-14)


def test_integers_of_one_trajectory_do_not_count_as_independent() -> None:
    integers = [value for value in drawn() for _ in range(2)]
    assert law_of(integers, readings=2).mean().statistical == pytest.approx(law_of(drawn()).mean().statistical)


@pytest.mark.parametrize(("counts", "trajectories"), [([1], None), ([3, 4], 2), ([2], 1)])
def test_rows_that_are_no_histogram_are_refused(counts: list[int], trajectories: int | None) -> None:
    with pytest.raises(ValueError, match="not that of"):
        Law.of(range(len(counts)), counts, trajectories)


@pytest.mark.parametrize("records", range(1, 6))
def test_the_birthday_expectation_is_that_of_all_sequences(records: int) -> None:
    """Exhaustive: the first repetition in every sequence of n + 1 draws."""
    sequences = list(itertools.product(range(records), repeat=records + 1))
    first = [next(i + 1 for i in range(len(s)) if s[i] in s[:i]) for s in sequences]
    assert exact(records) == pytest.approx(np.mean(first), rel=1e-13)


def test_the_birthday_expectation_of_a_year() -> None:
    """24.61658... people until two share one of 365 birthdays: common knowledge of the birthday problem."""
    assert exact(365) == pytest.approx(24.616585894598863, rel=1e-12)


def test_the_asymptotic_series_continues_the_exact_sum() -> None:
    """The next term of the series, 4 / (135 n) (The Art of Computer Programming, 1.2.11.3, from memory)."""
    for bits in (10, EXACT_UP_TO):
        records = 2**bits
        assert asymptotic(records) - exact(records) == pytest.approx(4 / (135 * records), rel=0.05)
    assert log2_until_repeated(np.array([4000.0]))[0] == pytest.approx(2000 + 0.5 * math.log2(math.pi / 2), rel=1e-15)
    assert log2_until_repeated(np.array([100.5, 99.5])) @ [1, -1] == pytest.approx(0.5, abs=1e-12)


def test_amounts_are_written_as_people_write_them() -> None:
    assert [repetitions(log2) for log2 in (0, 10, 17, 40, 2000)] == ["1", "1,024", "131,070", "10^12.0", "10^602"]
    assert wall_clock(0, 1e-4) == "under 1 second"
    assert wall_clock(math.log2(90 / 1e-4), 1e-4) == "1.5 minutes"
    assert wall_clock(math.log2(3.156e9 / 1e-4), 1e-4) == "100 years"
    assert wall_clock(2000, 1e-4) == "10^591 years"
