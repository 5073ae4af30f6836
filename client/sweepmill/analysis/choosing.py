"""Which rows of a table a fit takes: by the options of a command, with defaults where there is only one choice."""

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any, NamedTuple

import numpy as np

from sweepmill.analysis.points import Points
from sweepmill.analysis.selecting import COPIES, NotOneCurve, numbers, require_curves, require_finite
from sweepmill.analysis.wording import listed
from sweepmill.folds import Folds
from sweepmill.table import Table

_SIZES = ("sites", "width")
_NO_ABSCISSA = ("sites", "width", "height", "layers", COPIES)
_MOST_SHOWN = 12


@dataclass(frozen=True)
class Choice:
    """Observation, abscissa, values of other columns, window of the abscissa (inclusive) and sizes; None: all."""

    of: str | None = None
    x: str | None = None
    where: Mapping[str, Any] = field(default_factory=dict)
    window: tuple[float, float] | None = None
    sizes: tuple[float, ...] = ()


class Rows(NamedTuple):
    """Rows that are curves over x, one for each size, with the names of the columns."""

    table: Table
    sizes: str
    x: str


@dataclass(frozen=True, eq=False)
class Chosen:
    """The rows chosen, the points made of them, and what they show against what."""

    table: Table
    points: Points
    of: str
    x: str


def chosen(table: Table, choice: Choice, abscissae: tuple[str, ...] = ()) -> Chosen:
    """Points of one observation; `abscissae` are the columns that are x by default, before the only axis left.

    Raises NotOneCurve where an option is missing or names what is not there, saying what would pass; ValueError for
    rows without numbers.
    """
    rows, sizes, x = chosen_rows(table, choice, abscissae)
    require_finite(rows)
    points = Points.from_folds(rows, x, sizes) if isinstance(rows, Folds) else Points.from_table(rows, x, sizes)
    return Chosen(rows, points, str(rows.values("name")[0]), x)


def chosen_rows(table: Table, choice: Choice, abscissae: tuple[str, ...] = ()) -> Rows:
    """The rows that `chosen` makes points of. Raises as that does."""
    rows = _with_values(observed(table, choice.of), choice.where)
    sizes = size_column(rows)
    rows = _with_sizes(rows, sizes, choice.sizes)
    x = choice.x or _abscissa(rows, abscissae)
    if x not in rows and x not in rows.constants:
        raise NotOneCurve(f"x = {x!r} is no column: one of {', '.join((*rows.axes, 'layer', 'position'))}")
    rows = _within(rows, x, choice.window)
    require_curves(rows, x, sizes)
    return Rows(rows, sizes, x)


def size_column(table: Table) -> str:
    """The column that sizes are in: sites, or the width of a lattice."""
    return next((name for name in _SIZES if name in table or name in table.constants), _SIZES[0])


def observed(table: Table, of: str | None) -> Table:
    """The rows of one observation, by default the only one. Raises NotOneCurve, or ValueError without rows."""
    names = sorted(set(map(str, table.values("name"))))
    if not names:
        raise ValueError("the table has no rows: nothing is sampled yet")
    if of is None and len(names) > 1:
        raise NotOneCurve(f"the observation is to be chosen with --of: {', '.join(names)}")
    if of is not None and of not in names:
        raise NotOneCurve(f"no observation {of!r}: one of {', '.join(names)}")
    return table.where(name=of or names[0])


def _with_values(table: Table, conditions: Mapping[str, Any]) -> Table:
    for name, wanted in conditions.items():
        if name not in table and table.constants.get(name) == wanted:
            continue
        if name not in table:
            known = (*table.axes, "layer", "position")
            raise NotOneCurve(f"no column {name!r} to choose {wanted} of: one of {', '.join(known)}")
        kept = table.where(**{name: wanted})
        if not len(kept):
            raise NotOneCurve(f"no row has {name} = {wanted}: there are {_shown(table.values(name))}")
        table = kept
    return table


def _with_sizes(table: Table, name: str, wanted: tuple[float, ...]) -> Table:
    there = numbers(table, name)
    if missing := [size for size in wanted if size not in there]:
        raise NotOneCurve(f"no row has {name} = {listed(missing)}: there are {_shown(there.tolist())}")
    return table.where(**{name: [int(size) for size in wanted]}) if wanted and name in table else table


def _abscissa(table: Table, preferred: tuple[str, ...]) -> str:
    for name in preferred:
        if name in _NO_ABSCISSA or (name in table and _several(table, name)):
            return name
    if preferred == ("layer",):
        raise ValueError(
            f"{table.values('name')[0]} is read once per trajectory; a series of layers comes from an observation "
            "with at = { every = 2 } or at = { log_spaced = 40 }"
        )
    left = [axis for axis in table.axes if axis not in _NO_ABSCISSA and _several(table, axis)]
    if len(left) == 1:
        return left[0]
    found = ", ".join(left) or "none varies"
    raise NotOneCurve(f"the abscissa is to be chosen with --x: {found}")


def _several(table: Table, name: str) -> bool:
    return len(set(table.values(name))) > 1


def _within(table: Table, x: str, window: tuple[float, float] | None) -> Table:
    if window is None:
        return table
    there, (low, high) = numbers(table, x), window
    slack = 1e-11 * np.abs(there)  # axis values have 12 significant digits
    inside = np.flatnonzero((there >= low - slack) & (there <= high + slack))
    if not len(inside):
        raise NotOneCurve(f"no row has {low:g} <= {x} <= {high:g}: there are {_shown(there.tolist())}")
    return table.taken(inside.tolist())


def _shown(values: list[Any]) -> str:
    distinct = sorted(set(values), key=lambda value: (value is None, value))
    texts = [f"{value:g}" if isinstance(value, float) else str(value) for value in distinct]
    return ", ".join(texts if len(texts) <= _MOST_SHOWN else [*texts[:4], "...", *texts[-4:]])
