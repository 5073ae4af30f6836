"""Steady yet: the third against the fourth quarter of the layers."""

import numpy as np
import pytest

from sweepmill.analysis import Points, steady_yet

LAYERS = np.arange(2.0, 82.0, 2.0)


def series(mean: np.ndarray, noise: float, seed: int, key: str = "e" * 64, common: float = 0.0) -> Points:
    """40 readings on 64 folds; `common` is noise that all layers of a fold share."""
    generator = np.random.default_rng(seed)
    folds = mean + 8 * (noise * generator.standard_normal((64, 40)) + common * generator.standard_normal((64, 1)))
    replicas = (folds.sum(axis=0) - folds) / 63
    error = max(1e-3, float(np.hypot(noise, common)))
    return Points.of(16, LAYERS, folds.mean(axis=0), error, replicas, [key] * 40)


def test_a_settled_series_is_steady() -> None:
    result = steady_yet(series(2 - np.exp(-LAYERS), 0.0, seed=80))
    assert result.verdict == "steady"
    assert str(result).startswith("Steady: none of 1 ensembles")


def test_false_alarms_are_as_rare_as_promised() -> None:
    # 0.01 each: at most 3 of 12 (chance of more 5e-6 by the binomial law)
    verdicts = [steady_yet(series(np.full(40, 2.0), 0.01, seed)).verdict for seed in range(800, 812)]
    assert verdicts.count("still changing") <= 3


def test_a_growing_series_is_still_changing() -> None:
    # a change of 0.1 at an error of 0.005: cannot be missed
    result = steady_yet(series(1 + 0.005 * LAYERS, 0.01, seed=81))
    assert result.verdict == "still changing"
    assert "still changing" in str(result)
    assert result.rows[0].change == pytest.approx(0.1, abs=0.02)


def test_noise_that_all_layers_share_does_not_hide_a_change() -> None:
    result = steady_yet(series(1 + 0.005 * LAYERS, 0.01, seed=82, common=0.2))
    assert result.verdict == "still changing"
    assert result.rows[0].error < 0.02


def test_a_noisy_series_is_not_called_steady() -> None:
    assert steady_yet(series(np.full(40, 2.0), 0.5, seed=83)).verdict == "too noisy to tell"


def test_without_folds_the_error_is_a_bound() -> None:
    (row,) = steady_yet(Points.of(16, LAYERS, np.full(40, 2.0), 0.001)).rows
    assert row.bound
    assert row.error == pytest.approx(0.002)
    assert row.verdict == "steady"


def test_every_ensemble_has_a_row_and_the_worst_rules() -> None:
    good, bad = series(np.full(40, 2.0), 0.0, 84), series(1 + 0.005 * LAYERS, 0.01, 85, "f" * 64)
    both = Points.of(
        np.concatenate([good.sizes, bad.sizes]),
        np.concatenate([good.x, bad.x]),
        np.concatenate([good.mean, bad.mean]),
        np.concatenate([good.error, bad.error]),
        np.hstack([one.replicas for one in (good, bad) if one.replicas is not None]),
        [*good.keys, *bad.keys],
    )
    result = steady_yet(both)
    assert [row.verdict for row in result.rows] == ["steady", "still changing"]
    assert result.verdict == "still changing"
    assert result.to_dict()["ensembles"][1]["key"] == "f" * 64
    assert "1 of 2 ensembles" in str(result)
    assert "eeeeeeeeeeee" in result.text()


def test_a_series_without_late_layers_is_refused() -> None:
    with pytest.raises(ValueError, match="quarter"):
        steady_yet(Points.of(16, [1, 2, 100], [1.0, 1.0, 1.0], 0.1))


def test_what_has_vanished_is_steady() -> None:
    nothing = Points.of(16, LAYERS, np.zeros(40), 1e-3, np.zeros((64, 40)), ["e" * 64] * 40)
    result = steady_yet(nothing)
    assert result.verdict == "steady"
    assert result.rows[0].changed == "0"
