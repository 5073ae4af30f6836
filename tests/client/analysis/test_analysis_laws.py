"""Telling entanglement laws apart: exact curves with known answers, and what is said when the data cannot tell.

Curves are exact and have errors without noise, so that the verdicts are those of typical data and nothing depends on
luck, except where a seed is given.
"""

import json

import numpy as np
import pytest

from support.walls import RATE, edge_entropies, window_entropies
from sweepmill.analysis import Points, chord_length, fit_growth, fit_laws

LENGTHS = np.array([4, 6, 8, 12, 16, 24, 32, 48, 64, 96, 128.0])


def typical(x: np.ndarray, mean: np.ndarray, error: np.ndarray | float) -> Points:
    return Points.of(x.max(), x, mean, error)


def noisy(x: np.ndarray, mean: np.ndarray, error: float, seed: int) -> Points:
    return typical(x, mean + error * np.random.default_rng(seed).standard_normal(len(x)), error)


def test_the_walk_has_its_known_values() -> None:
    # exact, and the asymptotic amplitudes at finite time: derived independently, checked by brute force
    assert 2 ** -edge_entropies(11)[::2] == pytest.approx([0.4, 0.208, 0.11584, 0.066688, 0.03916288, 0.02330841088])
    assert 2 ** -window_entropies(11)[::2] == pytest.approx([0.25, 0.1, 0.046, 0.02272, 0.011728, 0.006241024])
    amplitude = 2 ** (RATE * 1600 - edge_entropies(1600)[-1]) * 1600**0.5
    assert amplitude == pytest.approx(1.328129, abs=1e-6)


@pytest.mark.parametrize(("which", "logarithm"), [("edge", 0.5), ("bulk", 1.5)])
def test_chaotic_edge_baths_have_a_volume_law_with_a_logarithm(which: str, logarithm: float) -> None:
    # positive logarithms of coefficient 1/2 (edge) and 3/2 (bulk) in any base that entropy and logarithm share,
    # slope log2(5/4): Phys. Rev. X 12, 011045 (2022), Phys. Rev. X 8, 021014 (2018)
    times = np.geomspace(1000, 16000, 9).round(-1)
    exact = (edge_entropies if which == "edge" else window_entropies)(16000)[times.astype(int) - 1]
    comparison = fit_laws(typical(times, exact, 0.01))
    assert comparison.verdict == "volume + logarithm"
    law = comparison["volume + logarithm"]
    assert abs(law["c_log2"].sigmas_from(logarithm)) < 2  # corrections of order 1/t are left
    assert law["c_log2"].value == pytest.approx(logarithm, abs=0.02)
    assert law["s"].value == pytest.approx(RATE, abs=1e-5)
    assert "in windows" in str(comparison)
    assert "not evidence of a phase" in str(comparison)


@pytest.mark.parametrize(("tail", "power"), [(-0.5, 1 / 3), (0.0, 1 / 2), (1.0, 2 / 3), (2.0, 3 / 4)])
def test_weak_links_give_the_fractional_law_of_their_distribution(tail: float, power: float) -> None:
    # links of rate G with density ~ G^tail: S = min_x (x + G_x t) ~ t^((tail + 1)/(tail + 2)) (Dynamics of entanglement
    # and transport in one-dimensional systems with quenched randomness, Phys. Rev. B 98, 035118 (2018)). The average of
    # the minimum over x = 0, 1, 2, … is the integral of the probability that every term exceeds it.
    scale = np.geomspace(30, 600, 9)
    times = scale ** (1 / power)
    exact = np.array([weak_link_average(tail, t, 8 * one) for one, t in zip(scale, times, strict=True)])
    comparison = fit_laws(typical(times, exact, 2e-3 * exact))
    assert comparison.verdict == "fractional"
    assert comparison["fractional"]["g"].value == pytest.approx(power, abs=0.02)
    assert abs(comparison["fractional"]["g"].sigmas_from(power)) < 1


def weak_link_average(tail: float, time: float, largest: float) -> float:
    entropies = np.linspace(0, largest, 600)
    off = np.clip((entropies[:, None] - np.arange(0, largest)) / time, 0, 1)
    return float(np.trapezoid(np.prod(1 - off ** (tail + 1), axis=1), entropies))


def test_an_area_law_is_told_from_all_others() -> None:
    comparison = fit_laws(typical(LENGTHS, np.full(11, 1.7), 0.01))
    assert comparison.verdict == "area"
    assert abs(comparison["area"]["a"].sigmas_from(1.7)) < 1


def test_a_logarithm_is_told_from_all_others_and_its_drift_is_stated() -> None:
    comparison = fit_laws(typical(LENGTHS, 1.6 * np.log(LENGTHS) + 0.4, 0.01))
    assert comparison.verdict == "logarithm"
    assert abs(comparison["logarithm"]["a"].sigmas_from(1.6)) < 1
    assert "Slope by ln x" in str(comparison)
    assert "not evidence of a phase" in str(comparison)


def test_a_volume_law_with_a_power_is_told_from_a_logarithm() -> None:
    comparison = fit_laws(typical(LENGTHS, 0.2 * LENGTHS + LENGTHS**0.4, 0.003))
    assert comparison.verdict == "volume + power"
    assert abs(comparison["volume + power"]["g"].sigmas_from(0.4)) < 1


def test_noise_changes_the_verdict_rarely() -> None:
    # a richer law is preferred by a factor of 20 once in 40 samples or less: 8 or more of 12 (chance of fewer 1e-5)
    samples = [noisy(LENGTHS, 1.6 * np.log(LENGTHS) + 0.4, 0.01, seed) for seed in range(420, 432)]
    assert [fit_laws(points).verdict for points in samples].count("logarithm") >= 8


def test_data_that_cannot_tell_say_so_and_say_what_would() -> None:
    comparison = fit_laws(typical(LENGTHS, LENGTHS**0.25, 0.05))
    assert comparison.verdict is None
    assert comparison.needs
    assert "cannot tell" in str(comparison)
    assert "times smaller" in str(comparison)


def test_the_precision_that_is_asked_for_does_tell() -> None:
    # the need is stated for a success rate of 0.95: 7 or more of 12 (chance of fewer: 1e-5 by the binomial law)
    (need, *_) = fit_laws(typical(LENGTHS, LENGTHS**0.25, 0.05)).needs
    assert need.precision is not None
    sharper = [fit_laws(noisy(LENGTHS, LENGTHS**0.25, 0.05 / need.precision, seed)) for seed in range(400, 412)]
    assert sum(one.verdict is not None for one in sharper) >= 7


def test_when_no_law_fits_the_verdict_is_none_and_errors_are_withheld() -> None:
    comparison = fit_laws(typical(LENGTHS, np.sin(LENGTHS), 0.001))
    assert comparison.verdict is None
    assert "None of the laws" in str(comparison)
    assert all(estimate.error is None for one in comparison.candidates for estimate in one.estimates.values())


def test_chords_make_a_ring_logarithmic() -> None:
    # S(l) = (c/3) log2 chord + b on a ring (J. Stat. Mech. P06002 (2004)); without chords it does not describe the data
    ring, lengths = 256.0, np.array([4, 8, 16, 32, 64, 96, 128.0])
    points = typical(lengths, 1.5 * np.log(chord_length(lengths, ring)) + 1, 0.005)
    with_chords, without = fit_laws(points, ring=ring), fit_laws(points)
    assert with_chords.verdict == "logarithm"
    assert abs(with_chords["logarithm"]["a"].sigmas_from(1.5)) < 1
    assert without["logarithm"].faults


def test_a_chord_of_a_short_interval_is_its_length() -> None:
    assert chord_length(np.array([1.0]), 1e6)[0] == pytest.approx(1.0)
    with pytest.raises(ValueError, match="ring of 8"):
        chord_length(np.array([8.0]), 8)


def test_free_fermion_chains_have_the_slope_of_their_central_charge() -> None:
    # open XX chain, half cut (nats), correlation-matrix method: S ~ (1/6) ln N; even N has an alternating correction
    # that falls as 1/N, so the window N >= 100 is nearer
    sizes = np.array([8, 16, 100, 1000.0])
    values = np.array([0.5697484844, 0.7143227702, 1.0491868161, 1.4384442661])
    slopes = fit_laws(Points.of(sizes, sizes, values, 1e-3)).slopes
    assert [one.slope for one in slopes][-1] == pytest.approx(1 / 6, abs=0.004)


@pytest.mark.parametrize(
    ("law", "name", "value"),
    [("linear", "v", 0.4), ("logarithmic", "a", 0.9), ("power", "g", 0.4), ("bounded", "a", 2.0)],
)
def test_growth_in_time_is_told_apart(law: str, name: str, value: float) -> None:
    times = np.geomspace(4, 400, 12).round()
    curves = {
        "linear": 0.4 * times + 1,
        "logarithmic": 0.9 * np.log(times) + 1,
        "power": times**0.4 + 1,
        "bounded": 2 - 1.5 * np.exp(-times / 40),
    }
    comparison = fit_growth(typical(times, curves[law], 0.004))
    assert comparison.verdict == law
    assert abs(comparison[law][name].sigmas_from(value)) < 1


def test_the_velocity_of_annealed_growth_is_the_exact_one() -> None:
    # E[2^-S] = (4/5)^t for a cut that layer t straddles: log2(5/4) bits per layer (Phys. Rev. X 8, 021014 (2018))
    times = np.arange(1.0, 40.0, 2.0)
    comparison = fit_growth(Points.of(100, times, times * RATE, 1e-3))
    assert comparison.verdict == "linear"
    assert comparison["linear"]["v"].value == pytest.approx(0.321928094887, abs=1e-9)


def test_results_are_plain_json_with_the_keys_of_their_ensembles() -> None:
    keys = [f"{place:064x}" for place in range(11)]
    points = Points.of(LENGTHS, LENGTHS, np.log(LENGTHS), 0.01, keys=keys)
    written = json.loads(fit_laws(points).to_json())
    assert written["ensembles"] == keys
    assert {one["law"] for one in written["candidates"]} >= {"area", "fractional"}


def test_lengths_must_be_positive() -> None:
    with pytest.raises(ValueError, match="positive"):
        fit_laws(Points.of(8, [0, 1, 2], [0, 1, 2], 0.1))


def test_samples_that_do_not_vary_still_have_the_errors_of_their_bounds() -> None:
    # nothing but zeros in 200 trajectories: the folds know of no noise, the bound of 1/200 is all there is
    sizes, error = np.array([8, 12, 16, 24, 32.0]), 0.005
    replicas, keys = np.zeros((64, 5)), [f"{size:064.0f}" for size in sizes]
    replicas[:3, 2] = 1e-5
    points = Points.of(sizes, sizes, replicas.mean(axis=0), error, replicas, keys)
    slope = fit_laws(points)["logarithm"]["a"]
    spread = np.log(sizes) - np.log(sizes).mean()
    assert slope.statistical >= 0.999 * error / np.sqrt(np.sum(spread**2))
