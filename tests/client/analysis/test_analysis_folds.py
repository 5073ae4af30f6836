"""Points from folds: means of the table, replicas from the trajectories, and refusal of what is no single curve."""

from typing import Any

import numpy as np
import pytest

from support.folds import Made, folds_of
from sweepmill.analysis import Points
from sweepmill.analysis.jackknife import jackknife_error
from sweepmill.coordinates import Coordinate
from sweepmill.folds import Folds

ALONE = (Coordinate(None, None, 4),)


def curves(**more: Any) -> list[Made]:
    """Two sizes at three rates."""
    generator = np.random.default_rng(5)
    return [
        Made({"sites": sites, "p": p, **more}, ALONE, generator.integers(0, sites, (2000, 1)))
        for sites in (8, 16)
        for p in (0.1, 0.2, 0.3)
    ]


def series(layers: tuple[int, ...] = (2, 4, 6), positions: tuple[int | None, ...] = (None,)) -> list[Made]:
    """One ensemble with several coordinates whose trajectories wander: its readings are correlated."""
    places = [Coordinate(layer, position, 1) for layer in layers for position in positions]
    steps = np.random.default_rng(6).integers(0, 3, (400, len(places)))
    return [Made({}, places, np.cumsum(steps, axis=1))]


def test_means_and_errors_are_those_of_the_table_and_replicas_those_of_the_trajectories() -> None:
    made = curves()
    points = Points.from_folds(folds_of(made), "p")
    assert points.sizes.tolist() == [8, 8, 8, 16, 16, 16]
    assert points.x.tolist() == [0.1, 0.2, 0.3] * 2
    for i, one in enumerate(made):
        values = one.values[:, 0] / 4
        assert points.mean[i] == pytest.approx(values.mean(), rel=1e-14)
        assert points.error[i] == pytest.approx(values.std(ddof=1) / np.sqrt(2000), rel=1e-12)
        assert points.replicas is not None
        without = [values[np.arange(2000) % 64 != r].mean() for r in range(64)]
        assert points.replicas[:, i] == pytest.approx(without, rel=1e-12)
    assert points.ensembles == [f"{i:064x}" for i in range(6)]


def test_the_layers_of_one_ensemble_are_correlated_points_of_one_size() -> None:
    points = Points.from_folds(folds_of(series(), sites=32), "layer")
    assert (points.sizes.tolist(), points.x.tolist()) == ([32] * 3, [2, 4, 6])
    assert points.replicas is not None
    # An Introduction to the Bootstrap (1993), chapter 11: the jackknife of a mean is its standard error, here with
    # 64 groups in place of single trajectories, so to some 9 percent; 0.6 is beyond six standard deviations
    assert jackknife_error(points.replicas) == pytest.approx(points.error, rel=0.6)
    assert points.covariance()[0, 2] > 0


def test_folds_of_different_numbers_are_put_together() -> None:
    few, many = curves()[0], series(tuple(range(2, 602, 2)))[0]
    wide = Made({"sites": 16, "p": 0.5}, many.places, many.values)
    folds = folds_of([few, wide])
    assert {len(one) for one in folds.values("numerators")} == {16, 64}
    points = Points.from_folds(folds.where(layer=[None, 2]), "p")
    assert points.replicas is not None
    assert points.folds == 16
    values, fold = few.values[:, 0] / 4, np.arange(2000) % 16
    assert points.replicas[:, 0] == pytest.approx([values[fold != r].mean() for r in range(16)], rel=1e-12)


@pytest.mark.parametrize(
    ("folds", "x", "message"),
    [
        (folds_of(series(), sites=8, p=0.1), "p", r"i3 has 3 layers per ensemble \(2, 4, 6\): take layer as x, or"),
        (folds_of(series((2, 4), (1, 2)), sites=8), "layer", "i3 has 2 positions per ensemble .*, as position = 2"),
        (folds_of(series((2, 4), (1, 2)), sites=8), "position", "i3 has 2 layers per ensemble"),
        (folds_of(curves(boundary="open") + curves(boundary="periodic")), "p", "differ in boundary: open and periodic"),
        (folds_of(curves()).where(p=0.7), "p", "there are no rows"),
        (folds_of([Made({"sites": 8, "p": "half"}, ALONE, np.ones((9, 1), np.int64))]), "p", "p = 'half' is not a num"),
        (folds_of([Made({"sites": 8, "p": 0.5}, ALONE, np.ones((1, 1), np.int64))]), "p", "no standard error"),
    ],
)
def test_rows_that_are_no_curves_are_refused_with_what_would_pass(folds: Folds, x: str, message: str) -> None:
    with pytest.raises(ValueError, match=message):
        Points.from_folds(folds, x)


def test_two_observations_are_not_one_curve() -> None:
    first, second = folds_of(curves()), folds_of(curves(), name="half")
    both = {name: [*first.values(name), *second.values(name)] for name in first.columns}
    with pytest.raises(ValueError, match="observations i3, half: choose one"):
        Points.from_folds(Folds(both), "p")


def test_independent_copies_may_lie_on_one_place_and_unknown_columns_are_named() -> None:
    folds = folds_of(curves(replicate=0) + curves(replicate=1))
    assert len(Points.from_folds(folds, "p")) == 12
    with pytest.raises(KeyError, match="no column 'rate'; the columns are sites, p"):
        Points.from_folds(folds, "rate")
