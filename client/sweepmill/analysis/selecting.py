"""From the rows of a table to points: one observation, one curve for each size, nothing mixed that differs."""

import math
from collections import defaultdict
from typing import Any

import numpy as np

from sweepmill.analysis.arrays import Vector
from sweepmill.analysis.wording import listed
from sweepmill.table import Table

COPIES = "replicate"  # an axis whose values are independent copies of one ensemble


class NotOneCurve(ValueError):
    """Rows that are several curves where one is wanted; the message says what to choose."""


def numbers(table: Table, name: str) -> Vector:
    """A column [rows], or what all ensembles have in common under its name, as floats.

    Raises KeyError for what is neither, ValueError where a row has no number.
    """
    if name not in table and name not in table.constants:
        raise KeyError(f"no column {name!r}; the columns are {', '.join(table.columns)}")
    values = table.values(name) if name in table else [table.constants[name]] * len(table)
    bad = [value for value in values if isinstance(value, bool) or not isinstance(value, int | float)]
    if bad:
        raise ValueError(f"{name} = {bad[0]!r} is not a number: choose rows that have one")
    return np.array(values, dtype=np.float64)


def keys_of(table: Table) -> tuple[str, ...]:
    """The ensemble key of every row; empty where the table does not know them."""
    keys = [""] * len(table)
    for ensemble in table.ensembles:
        began, ended = ensemble["rows"]
        keys[began:ended] = [str(ensemble["key"])] * (ended - began)
    return tuple(keys) if all(keys) else ()


def require_curves(table: Table, x: str, sizes: str) -> None:
    """Raise NotOneCurve unless the rows are curves of one observation over x, one for each size.

    The message names the column, its values and what would pass. Raises ValueError where there are no rows.
    """
    if not len(table):
        raise ValueError("there are no rows: nothing is sampled yet, or the conditions leave nothing")
    names = list(dict.fromkeys(table.values("name")))
    if len(names) > 1:
        raise NotOneCurve(f"the rows are of the observations {listed(names)}: choose one, as name = {names[0]}")
    for column, plural in (("layer", "layers"), ("position", "positions")):
        _require_one(table, column, plural, x, sizes)
    _require_same(table, x, sizes)


def _require_one(table: Table, column: str, plural: str, x: str, sizes: str) -> None:
    found: dict[tuple[Any, ...], set[Any]] = defaultdict(set)
    if column in (x, sizes):
        return
    for row in table.rows():
        found[tuple(row[axis] for axis in table.axes)].add(row[column])
    most = max(found.values(), key=len)
    if len(most) > 1:
        name, some = table.values("name")[0], listed(sorted(most, key=_order))
        choice = sorted(most, key=_order)[-1]
        raise NotOneCurve(
            f"{name} has {len(most)} {plural} per ensemble ({some}): take {column} as x, or choose one, "
            f"as {column} = {choice}"
        )


def _require_same(table: Table, x: str, sizes: str) -> None:
    """Rows at one place must not differ in another axis: they would be two curves taken for one."""
    others = [axis for axis in table.axes if axis not in (x, sizes, COPIES)]
    seen: dict[tuple[Any, ...], dict[str, Any]] = {}
    for row in table.rows():
        place = tuple(row.get(name) for name in dict.fromkeys((sizes, x)))
        first = seen.setdefault(place, row)
        for axis in others:
            if row[axis] != first[axis]:
                raise NotOneCurve(
                    f"rows of one place ({x} = {row.get(x)}) differ in {axis}: {first[axis]} and {row[axis]}; "
                    f"choose one, as {axis} = {first[axis]}"
                )


def require_finite(table: Table) -> None:
    """Raise ValueError for a row without a mean or a standard error, naming it."""
    for row in table.rows():
        for name in ("mean", "standard_error"):
            if row[name] is None or not math.isfinite(row[name]):
                where = ", ".join(f"{axis} = {row[axis]}" for axis in table.axes)
                raise ValueError(
                    f"{row['name']} at {where or 'the only ensemble'} has no {name.replace('_', ' ')} "
                    f"({row['trajectories']} trajectories): sample more, or leave the row out"
                )


def _order(value: Any) -> tuple[bool, Any]:
    return value is not None, 0 if value is None else value
