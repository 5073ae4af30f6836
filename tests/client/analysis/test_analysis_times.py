"""Times read off curves, their growth with size, and decay with distance."""

import numpy as np
import pytest

from sweepmill.analysis import Points, fit_decay, fit_times, purification_times, settling_depths

# mean entropy (bits) of a maximally mixed start after layers 1 … 6, periodic chain of 4, rate 0.16: exact, by
# enumerating all stabilizer groups
PURIFYING = [3.36, 2.836850688, 2.427202310176, 2.101621828649, 1.836954815440, 1.617385045065]
SIZES = np.array([8, 12, 16, 24, 32, 48.0])


def test_the_purification_time_lies_between_the_layers_that_bracket_the_threshold() -> None:
    times = purification_times(Points.of(4, np.arange(1.0, 7.0), PURIFYING, 1e-6), threshold=2.0)
    share = np.log(2.101621828649 / 2) / np.log(2.101621828649 / 1.836954815440)
    assert times.mean[0] == pytest.approx(4 + share)
    assert times.error[0] > 0


def test_sizes_that_were_not_followed_long_enough_are_left_out() -> None:
    layers = np.arange(1.0, 7.0)
    points = Points.of([4] * 6 + [8] * 6, [*layers, *layers], [*PURIFYING, *np.full(6, 7.0)], 1e-6)
    assert purification_times(points, threshold=2.0).sizes.tolist() == [4]
    with pytest.raises(ValueError, match="none of the curves"):
        purification_times(points, threshold=1.0)


def test_errors_of_times_come_from_the_folds_where_there_are_any() -> None:
    # one common factor (1 + e) on a curve exp(-t/10) moves the time by 10 e: errors of 0.01 give 0.1
    layers, generator = np.arange(1.0, 101.0), np.random.default_rng(70)
    factors = 1 + 0.01 * np.sqrt(64) * generator.standard_normal(64)
    folds = 8 * np.exp(-layers / 10) * factors[:, None]
    replicas = (folds.sum(axis=0) - folds) / 63
    points = Points.of(8, layers, folds.mean(axis=0), 0.01, replicas, ["d" * 64] * 100)
    times = purification_times(points)
    assert times.mean[0] == pytest.approx(10 * np.log(8 * factors.mean()), abs=1e-6)
    assert times.error[0] == pytest.approx(10 * factors.std(ddof=1) / 8 / factors.mean(), rel=0.02)
    assert times.ensembles == ["d" * 64]


@pytest.mark.parametrize(
    ("law", "times", "name", "value"),
    [
        ("power", 1.4 * SIZES, "z", 1.0),
        ("logarithmic", 6 * np.log(SIZES) - 2, "a", 6.0),
        ("exponential", 5 * np.exp(0.08 * SIZES), "rate", 0.08),
    ],
)
def test_the_three_regimes_of_purification_are_told_apart(law: str, times: np.ndarray, name: str, value: float) -> None:
    # about L at the transition (z = 1), ln L in the pure, exponential in the mixed phase (Phys. Rev. X 10, 041020
    # (2020)); exact curves with errors of 1 %
    comparison = fit_times(Points.of(SIZES, SIZES, times, 0.01 * times))
    assert comparison.verdict == law
    assert abs(comparison[law][name].sigmas_from(value)) < 1
    assert comparison[law].drift  # the window scan


@pytest.mark.parametrize(("law", "name", "value"), [("power law", "k", 4 / 3), ("exponential", "rate", 0.2)])
def test_decay_with_distance_is_a_power_or_exponential(law: str, name: str, value: float) -> None:
    distance = np.array([2, 3, 4, 6, 8, 12, 16, 24.0])
    exact = distance**-value if law == "power law" else np.exp(-value * distance)
    comparison = fit_decay(Points.of(64, distance, exact, 0.02 * exact))
    assert comparison.verdict == law
    assert abs(comparison[law][name].sigmas_from(value)) < 1


def test_the_depth_a_circuit_needs_grows_with_its_size() -> None:
    # S = 1 - exp(-3 t/L) is within 5 % of its end at t = L ln(20)/3
    sizes, curves = (8, 16, 32), []
    layers = np.arange(2.0, 161.0, 2.0)
    for size in sizes:
        curves.append(1 - np.exp(-3 * layers / size))
    points = Points.of(np.repeat(sizes, 80), np.tile(layers, 3), np.concatenate(curves), 1e-4)
    depths = settling_depths(points)
    assert depths.mean == pytest.approx(np.array(sizes) * np.log(20) / 3, rel=0.02)
    assert fit_times(depths)["power"].fitted.exponent == pytest.approx(1.0, abs=0.03)
