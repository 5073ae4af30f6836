"""The input of every analysis: what is refused, and which points are correlated."""

import numpy as np
import pytest
from scipy import stats

from sweepmill.analysis import Points, jackknife_error, replicas_from_folds
from sweepmill.errors import SharedTrajectories
from sweepmill.table import Table

KEYS = ("a" * 64, "a" * 64, "b" * 64)


def three(**changes: object) -> Points:
    given = {"sizes": 8, "x": [1, 2, 3], "mean": [1.0, 2.0, 3.0], "error": 0.1} | changes
    return Points.of(**given)  # type: ignore[arg-type]


def test_errors_that_are_not_positive_are_refused() -> None:
    with pytest.raises(ValueError, match="standard error must be positive"):
        three(error=[0.1, 0.0, 0.1])


def test_numbers_that_are_not_finite_are_refused() -> None:
    with pytest.raises(ValueError, match="finite"):
        three(mean=[1.0, np.nan, 2.0])


def test_replicas_without_keys_are_refused_because_correlations_would_be_unknown() -> None:
    with pytest.raises(ValueError, match="ensemble key"):
        three(replicas=np.ones((8, 3)))


def test_replicas_of_another_shape_are_refused() -> None:
    with pytest.raises(ValueError, match="shape"):
        three(replicas=np.ones((8, 2)), keys=KEYS)


def test_the_same_trajectories_twice_are_refused() -> None:
    with pytest.raises(SharedTrajectories):
        three(x=[1, 1, 3], keys=KEYS)


def test_points_of_different_ensembles_have_no_covariance_and_their_own_errors() -> None:
    replicas = np.random.default_rng(1).standard_normal((16, 3))
    covariance = three(replicas=replicas, keys=KEYS).covariance()
    assert covariance[0, 2] == covariance[1, 2] == 0
    assert covariance[0, 1] == pytest.approx(15 / 16 * np.cov(replicas.T, ddof=0)[0, 1] * 16)
    assert covariance[2, 2] == pytest.approx(0.01)  # from all trajectories, not from the folds


def test_the_jackknife_of_a_mean_is_its_standard_error() -> None:
    values = np.random.default_rng(2).standard_normal((200, 2))
    replicas = replicas_from_folds(values, np.ones((200, 2)))
    np.testing.assert_allclose(jackknife_error(replicas), stats.sem(values), rtol=1e-12)


def test_folds_may_be_of_unequal_size() -> None:
    replicas = replicas_from_folds(np.array([[3.0], [5.0], [1.0]]), np.array([[3.0], [2.0], [1.0]]))
    np.testing.assert_allclose(replicas[:, 0], [6 / 3, 4 / 4, 8 / 5])


def test_thinning_keeps_both_ends_and_spreads_evenly_in_the_logarithm() -> None:
    x = np.arange(1.0, 129.0)
    assert Points.of(128, x, x, 1.0).thinned(8).x.tolist() == [1, 2, 4, 8, 16, 32, 64, 128]


def test_a_table_gives_its_keys_along() -> None:
    columns: dict[str, list[float]] = {
        "sites": [8, 8],
        "measurement_rate": [0.1, 0.2],
        "mean": [1.0, 2.0],
        "standard_error": [0.1, 0.2],
    }
    ensembles = [{"key": "a" * 64, "rows": [0, 1]}, {"key": "b" * 64, "rows": [1, 2]}]
    points = Points.from_table(Table(columns, {"ensembles": ensembles}), "measurement_rate")
    assert points.ensembles == ["a" * 64, "b" * 64]
    assert points.x.tolist() == [0.1, 0.2]
