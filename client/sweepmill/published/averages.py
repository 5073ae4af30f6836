"""Averages read off a table or its exact histograms, with standard errors."""

import math
from collections.abc import Mapping

import numpy as np

from sweepmill.analysis import Estimate
from sweepmill.analysis.arrays import Vector
from sweepmill.counts import VARIED_FROM
from sweepmill.published.models import Average
from sweepmill.table import Table


def average(one: Average, table: Table, histograms: Table) -> Estimate:
    """The estimate of one average. Raises ValueError unless its rows are those of one coordinate."""
    conditions = {"layer": one.layer, "sites": one.sites}
    where = {"name": one.name} | {name: value for name, value in conditions.items() if value is not None}
    if one.of == "mean":
        (mean,), (error,) = (_rows(table, where, one)[name] for name in ("mean", "standard_error"))
        return Estimate(float(mean), float(error))
    rows = _rows(histograms, where, one)
    values = np.asarray(rows["value"], dtype=np.float64)
    results = 2.0**-values if one.of == "purity" else np.asarray(values == one.value, dtype=np.float64)
    return weighted(results, np.asarray(rows["occurrences"], dtype=np.float64))


def weighted(results: Vector, occurrences: Vector) -> Estimate:
    """Mean of results [H] that occurred so often, and its standard error; nan for fewer than two trajectories.

    A sample that hardly varies has a bound for an error, as in a table: that with one more trajectory that differs by
    the largest result.
    """
    count = float(occurrences.sum())
    mean = float(results @ occurrences) / count
    squares = float((results - mean) ** 2 @ occurrences)
    if count - occurrences.max() < VARIED_FROM:
        squares += max(float(np.abs(results).max()), 1 / count) ** 2
    return Estimate(mean, math.sqrt(squares / (count - 1) / count) if count > 1 else math.nan)


def _rows(table: Table, where: Mapping[str, object], one: Average) -> Table:
    rows = table.where(**{name: value for name, value in where.items() if name in table})
    places = set(zip(rows.values("layer"), rows.values("position"), strict=True))
    if len(places) != 1 or (one.of == "mean" and len(rows) != 1):
        raise ValueError(f"{one.quantity}: {len(rows)} rows of {len(places)} coordinates where one is wanted")
    return rows
