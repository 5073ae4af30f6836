"""The fits that have a name: from rows of folds to the right law, and what they refuse."""

from typing import Any

import numpy as np
import pytest

from support.folds import Made, folds_of, scatter
from sweepmill import Folds
from sweepmill.analysis import mean_purities
from sweepmill.analysis.choosing import Choice
from sweepmill.analysis.kinds import KINDS, Options, Report
from sweepmill.analysis.selecting import NotOneCurve
from sweepmill.coordinates import Coordinate
from sweepmill.table import Table

SCALE = 1000


def fitted(what: str, folds: Table, choice: Choice | None = None, options: Options | None = None) -> Report:
    kind = KINDS[what]
    return kind.run(kind.choose(folds, choice or Choice(), kind.abscissae), options or Options())


def one_ensemble(axes: dict[str, float], places: list[tuple[int | None, int | None]], mean: np.ndarray) -> Made:
    """640 trajectories of an invented observation, their noise 0.05."""
    where = [Coordinate(layer, position, SCALE) for layer, position in places]
    return Made(axes, where, np.rint(SCALE * (mean + scatter(len(mean), 0.05, len(mean)))).astype(np.int64))


def purifying(depth: int = 6) -> Folds:
    """Entropies that fall from the size to 0 within times proportional to the size: S = L exp(-2 t / L)."""
    made = []
    for sites in (8, 16, 32, 64):
        times = np.unique(np.geomspace(2, depth * sites, 24).astype(int))
        entropy = sites * np.exp(-2 * times / sites)
        made.append(one_ensemble({"sites": sites}, [(int(t), None) for t in times], entropy))
    return folds_of(made, "whole")


def test_purification_times_are_listed_with_the_law_of_their_growth() -> None:
    report = fitted("times", purifying())
    assert report.labels == ("L", "layers until 1 bit is left")
    rows = report.tables[0].splitlines()[1:]
    assert [row.split()[0] for row in rows] == ["8", "16", "32", "64"]
    # S = 1 at t = L ln(L) / 2
    times = [float(row.split()[1].split("(")[0]) for row in rows]
    assert times == pytest.approx([size / 2 * np.log(size) for size in (8, 16, 32, 64)], rel=0.03)
    assert len(report.tables) >= 3


def test_a_curve_that_is_not_followed_long_enough_is_noted() -> None:
    report = fitted("times", purifying(depth=2))  # 2 L layers: S = 1 at L ln(L) / 2, within them for L <= 32
    assert any("L = 64 gives no time" in note for note in report.notes)


def test_a_correlation_that_falls_as_a_power_is_told_from_an_exponential() -> None:
    positions = [1, 2, 3, 4, 6, 8, 12, 16]
    mean = 40 * np.array(positions) ** -2.0
    report = fitted("decay", folds_of([one_ensemble({}, [(None, x) for x in positions], mean)], sites=64))
    assert "follow the law power law (a x^-k)" in str(report.result)


def test_several_curves_where_one_is_wanted_are_refused() -> None:
    with pytest.raises(NotOneCurve, match="choose one of 8, 16, 32, 64 with --sizes"):
        fitted("growth", purifying())


def test_purities_need_the_histogram_of_an_entropy() -> None:
    nothing = Table({"name": [], "quantity": []})
    with pytest.raises(ValueError, match="submit an entropy with histogram = true"):
        mean_purities(nothing)
    columns: dict[str, list[Any]] = {
        "sites": [8, 8],
        "name": ["bits"] * 2,
        "quantity": ["record-bits"] * 2,
        "region": ["all"] * 2,
    }
    rest: dict[str, list[Any]] = {
        "layer": [None] * 2,
        "position": [None] * 2,
        "value": [3, 4],
        "by_fold": [[1] * 16, [2] * 16],
    }
    with pytest.raises(ValueError, match="record-bits is no entropy"):
        mean_purities(Table({**columns, **rest}), x="sites")


def test_the_purity_of_two_values_is_their_weighted_mean_in_every_fold() -> None:
    columns: dict[str, list[Any]] = {
        "sites": [8, 8, 16],
        "name": ["half"] * 3,
        "quantity": ["entropy"] * 3,
        "region": ["half"] * 3,
    }
    by_fold = [[1, 2, 3, 2], [3, 2, 1, 2], [4, 4, 4, 4]]
    rest: dict[str, list[Any]] = {"layer": [None] * 3, "position": [None] * 3, "value": [0, 3, 1], "by_fold": by_fold}
    ensembles = [{"key": "a" * 64, "rows": [0, 2]}, {"key": "b" * 64, "rows": [2, 3]}]
    result = mean_purities(Table({**columns, **rest}, {"ensembles": ensembles}), x="sites")
    assert [one.estimate.value for one in result.averages] == [(8 + 8 / 8) / 16, 0.5]
    assert result.points.mean.tolist() == pytest.approx([-np.log2(9 / 16), 1.0])
    assert result.averages[0].replicas.tolist() == pytest.approx(
        [(8 - n + (8 - m) / 8) / 12 for n, m in zip(*by_fold[:2], strict=True)]
    )
    assert result.to_dict()["ensembles"] == ["a" * 64, "b" * 64]
