"""Folds of made-up trajectories, as the service would serve them."""

from collections.abc import Sequence
from typing import Any, NamedTuple

import numpy as np
from numpy.typing import NDArray

from sweepmill.accumulate import Accumulator
from sweepmill.coordinates import Coordinate
from sweepmill.folds import Folds, fold_ratios
from sweepmill.statistics import summarize


class Made(NamedTuple):
    """One ensemble: the values of its axes, its coordinates and integer values [trajectories, coordinates]."""

    axes: dict[str, Any]
    places: Sequence[Coordinate]
    values: NDArray[np.int64]


def scatter(seed: int, size: float, coordinates: int = 1, trajectories: int = 640) -> NDArray[np.float64]:
    """Noise [trajectories, coordinates] that adds up to nothing: means stay what they were made, errors are as large.

    What a test finds does not depend on luck then.
    """
    noise = size * np.random.default_rng(seed).standard_normal((trajectories, coordinates))
    return np.asarray(noise - noise.mean(axis=0))


def folds_of(ensembles: Sequence[Made], name: str = "i3", **constants: Any) -> Folds:
    """Folds of the ensembles in order, their keys made up."""
    rows: list[dict[str, Any]] = []
    known: list[dict[str, Any]] = []
    for ordinal, one in enumerate(ensembles):
        total, began = Accumulator.from_values(one.values, 0), len(rows)
        tops, bottoms = fold_ratios(total, one.places)
        for i, (place, moments) in enumerate(zip(one.places, summarize(total, one.places), strict=True)):
            row = {**one.axes, "name": name, "quantity": "entropy", "region": "half"}
            row |= {"layer": place.layer, "position": place.position, "trajectories": total.count}
            row |= {"mean": moments.mean, "standard_error": moments.standard_error}
            rows.append(row | {"numerators": tops[:, i].tolist(), "denominators": bottoms[:, i].tolist()})
        known.append({"key": f"{ordinal:064x}", "ordinal": ordinal, "rows": [began, len(rows)]})
    columns = {column: [row[column] for row in rows] for column in rows[0]}
    metadata = {"sweep": "5" * 64, "axes": list(ensembles[0].axes), "constants": constants, "ensembles": known}
    return Folds(columns, metadata)
