"""Steady yet? The third against the fourth quarter of the layers of every ensemble."""

import json
import math
from collections.abc import Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Any, Literal

import numpy as np
from scipy import stats

from sweepmill.analysis.arrays import Mask, Vector
from sweepmill.analysis.estimate import finite, with_error
from sweepmill.analysis.jackknife import jackknife_error
from sweepmill.analysis.points import Points
from sweepmill.text import aligned, short

if TYPE_CHECKING:
    from matplotlib.figure import Figure

Verdict = Literal["steady", "still changing", "too noisy to tell"]
VERDICTS: tuple[Verdict, ...] = ("still changing", "too noisy to tell", "steady")  # the worst first
FALSE_ALARM = 0.01  # probability that any of the ensembles is called changing when none is
TOLERANCE = 0.02  # a change by this share of the mean would matter


@dataclass(frozen=True)
class Quarter:
    """One ensemble: mean of the third and of the fourth quarter, their difference, its error and the verdict.

    `bound` tells that the error is a bound: without folds, the correlation of layers is unknown. `label` is what the
    ensemble is called by.
    """

    key: str
    size: float
    layers: float
    third: float
    fourth: float
    change: float
    error: float
    bound: bool
    verdict: Verdict
    label: str = ""

    @property
    def scale(self) -> float:
        """What changes are measured by: the larger of the two means."""
        return max(abs(self.third), abs(self.fourth)) or 1.0

    @property
    def changed(self) -> str:
        """The change with its error; an error of rounding only is left out."""
        return with_error(self.change, self.error) if self.error > 2 * math.ulp(1.0) else f"{self.change:g}"

    def __str__(self) -> str:
        return (
            f"{self.label or f'L = {self.size:g}'}, {self.layers:g} layers: {self.verdict} (from the third to the "
            f"fourth quarter the mean changed by {self.changed}, "
            f"{100 * self.change / self.scale:+.2g} %)"
        )


@dataclass(frozen=True, eq=False)
class Steadiness:
    """Result of `steady_yet`: one row per ensemble with its `series`, and one verdict on all."""

    rows: tuple[Quarter, ...]
    series: tuple[Points, ...]
    tolerance: float

    @property
    def verdict(self) -> Verdict:
        """The worst of the rows: still changing before too noisy before steady."""
        return next(one for one in VERDICTS if any(row.verdict == one for row in self.rows))

    def __str__(self) -> str:
        bad = [row for row in self.rows if row.verdict != "steady"]
        if not bad:
            return f"Steady: none of {len(self.rows)} ensembles changed from the third to the fourth quarter of layers."
        return f"Not shown to be steady, {len(bad)} of {len(self.rows)} ensembles: " + "; ".join(map(str, bad)) + "."

    def summary(self) -> str:
        """How many ensembles have which verdict, in one sentence."""
        if self.verdict == "steady":
            return str(self)
        counts = [(sum(row.verdict == one for row in self.rows), one) for one in VERDICTS]
        said = ", ".join(f"{number} {one}" for number, one in counts if number)
        noun = "ensemble" if len(self.rows) == 1 else "ensembles"
        return f"Not shown to be steady: of {len(self.rows)} {noun}, {said}."

    def more_needed(self) -> float:
        """By what factor more trajectories would let every noisy series tell; 1 where none is too noisy."""
        noisy = [row for row in self.rows if row.verdict == "too noisy to tell"]
        room = [max(self.tolerance * row.scale - abs(row.change), self.tolerance * row.scale / 2) for row in noisy]
        return max([1.0, *((2 * row.error / left) ** 2 for row, left in zip(noisy, room, strict=True))])

    def text(self) -> str:
        """All rows, aligned."""
        head = ["ensemble", "L", "layers", "third", "fourth", "change", "verdict"]
        rows = [[r.label or short(r.key), r.size, r.layers, r.third, r.fourth, r.changed, r.verdict] for r in self.rows]
        return aligned(head, rows)

    def plot(self, path: str | Path | None = None, x_label: str = "layer", y_label: str = "y") -> "Figure":
        """The series and the changes between their last quarters in one figure, written to `path` if given."""
        from sweepmill.analysis.plot_steady import plot_steady

        return plot_steady(self, path, x_label, y_label)

    def to_dict(self) -> dict[str, Any]:
        """Everything as plain values, with the keys of the ensembles."""
        rows = [{name: finite(v) if isinstance(v, float) else v for name, v in vars(row).items()} for row in self.rows]
        return {"analysis": "steady yet", "verdict": self.verdict, "tolerance": self.tolerance, "ensembles": rows}

    def to_json(self) -> str:
        """`to_dict` as JSON text."""
        return json.dumps(self.to_dict(), indent=1, allow_nan=False)


def steady_yet(points: Points, tolerance: float = TOLERANCE) -> Steadiness:
    """Judge series mean(x), x the layers, one per ensemble (per size where there are no keys).

    "still changing": the difference of the quarters is beyond noise (all ensembles together raise that alarm falsely
    with probability 0.01). "steady": it is not, and a change by more than the share `tolerance` of the mean is
    excluded at two standard errors, or all readings are 0. Errors by jackknife over the folds, for layers of one
    trajectory are correlated; without folds a bound is used. Raises ValueError for a series without layers in both
    quarters.
    """
    return steady_series(tuple(_series(points)), tolerance)


def steady_series(series: tuple[Points, ...], tolerance: float = TOLERANCE, labels: tuple[str, ...] = ()) -> Steadiness:
    """`steady_yet` for series that are given one by one, perhaps with what to call them."""
    if not series:
        raise ValueError("no series of layers: there is nothing to judge")
    limit = float(stats.norm.isf(FALSE_ALARM / len(series) / 2))
    names = labels or ("",) * len(series)
    rows = (_judge(one, limit, tolerance, name) for one, name in zip(series, names, strict=True))
    return Steadiness(tuple(rows), series, tolerance)


def _series(points: Points) -> Iterator[Points]:
    blocks = points.blocks() if points.keys else np.unique(points.sizes, return_inverse=True)[1]
    for block in range(int(blocks.max()) + 1):
        yield points.taken(np.asarray(blocks == block))


def _judge(series: Points, limit: float, tolerance: float, label: str) -> Quarter:
    last = float(series.x.max())
    third: Mask = (series.x > 0.5 * last) & (series.x <= 0.75 * last)
    fourth: Mask = series.x > 0.75 * last
    if not third.any() or not fourth.any():
        what = label or f"size {series.sizes[0]:g}"
        raise ValueError(f"{what} has no layers in its third or fourth quarter: read more of them")
    before, after = float(series.mean[third].mean()), float(series.mean[fourth].mean())
    error, change = _error(series, third, fourth), after - before
    verdict: Verdict = "steady"
    if abs(change) > limit * error:
        verdict = "still changing"
    elif abs(change) + 2 * error > tolerance * max(abs(before), abs(after)) and (before, after) != (0, 0):
        verdict = "too noisy to tell"
    key, bound = series.keys[0] if series.keys else "", series.replicas is None
    return Quarter(key, float(series.sizes[0]), last, before, after, change, error, bound, verdict, label)


def _error(series: Points, third: Mask, fourth: Mask) -> float:
    if series.replicas is None:
        return float(series.error[third].mean() + series.error[fourth].mean())
    differences: Vector = series.replicas[:, fourth].mean(axis=1) - series.replicas[:, third].mean(axis=1)
    return max(float(jackknife_error(differences[:, None])[0]), math.ulp(1.0))
