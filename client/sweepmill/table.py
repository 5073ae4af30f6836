"""The table of a sweep: one row per ensemble, observation and coordinate."""

from __future__ import annotations

import math
from bisect import bisect_left
from collections.abc import Iterator, Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any, Self

import numpy as np
from numpy.typing import NDArray

from sweepmill.errors import SharedTrajectories
from sweepmill.text import aligned, html, short

if TYPE_CHECKING:
    import pandas
    import xarray

# Columns that every table has, in this order, after the axes.
PLACE = ("name", "quantity", "region", "layer", "position")
RESULTS = ("trajectories", "mean", "standard_error", "variance", "minimum", "maximum", "met_by")
INTEGERS = ("layer", "position", "trajectories")
REALS = ("mean", "standard_error", "variance", "minimum", "maximum")
COUNTS = ("value", "occurrences")  # in place of the results, in a table of histograms
FOLDS = ("numerators", "denominators")  # lists, in a table of folds
BY_FOLD = "by_fold"  # occurrences in every fold, in a table of histograms
_SHOWN = ("name", "layer", "position", *COUNTS, "trajectories", "mean", "standard_error", "met_by")
_HEAD = 10


class Table:
    """Columns of equal length and metadata; immutable by convention.

    Means, standard errors and the rest are in the units of their quantity (entropies in bits). `layer` and
    `position` are None where they have no meaning. The metadata names every ensemble with its key, its range
    of trajectories and its digest.
    """

    def __init__(self, columns: Mapping[str, Sequence[Any]], metadata: Mapping[str, Any] | None = None) -> None:
        self._columns = {name: list(values) for name, values in columns.items()}
        self.metadata: dict[str, Any] = dict(metadata or {})
        if len({len(values) for values in self._columns.values()}) > 1:
            raise ValueError("the columns of a table must be equally long")

    @classmethod
    def read(cls, path: str | Path) -> Self:
        """Read a file that `download` wrote: .json, or .csv, .parquet and .arrow with the extra `analysis`."""
        from sweepmill.table_files import read_columns

        return cls(*read_columns(Path(path)))

    @property
    def columns(self) -> tuple[str, ...]:
        """Names of the columns, the axes first."""
        return tuple(self._columns)

    @property
    def axes(self) -> tuple[str, ...]:
        """Names of the columns that are axes of the sweep."""
        return tuple(name for name in self._columns if name not in (*PLACE, *RESULTS, *COUNTS, *FOLDS, BY_FOLD))

    @property
    def constants(self) -> dict[str, Any]:
        """What all ensembles of the sweep have in common, the family included; empty where the file does not say."""
        return dict(self.metadata.get("constants", {}))

    @property
    def ensembles(self) -> list[dict[str, Any]]:
        """Every ensemble the table rests on: its `key`, and what its numbers are made of.

        `rows` is the half-open range of its rows; `observations` gives the half-open range of `trajectories` and
        the digest of the total for every observation key.
        """
        return list(self.metadata.get("ensembles", []))

    def __len__(self) -> int:
        return len(next(iter(self._columns.values()), []))

    def __contains__(self, name: object) -> bool:
        return name in self._columns

    def __getitem__(self, name: str) -> NDArray[Any]:
        """One column as an array of shape [rows]: floats with nan for what is absent, integers, or objects."""
        values = self.values(name)
        if name in REALS:
            return np.array([math.nan if v is None else v for v in values], dtype=np.float64)
        plain = all(isinstance(v, int | float) for v in values) and bool(values)
        return np.array(values) if plain else np.array(values, dtype=object)

    def values(self, name: str) -> list[Any]:
        """One column as stored: a list of int, float, str or None. Raises KeyError."""
        if name not in self._columns:
            raise KeyError(f"no column {name!r}; the columns are {', '.join(self._columns)}")
        return self._columns[name]

    def rows(self) -> Iterator[dict[str, Any]]:
        """One dictionary per row."""
        for values in zip(*self._columns.values(), strict=True):
            yield dict(zip(self._columns, values, strict=True))

    def where(self, **conditions: Any) -> Self:
        """Rows whose columns have the given values; a list, set or range means any of its members.

        Raises KeyError for a column that is not there.
        """
        keep: Sequence[int] = range(len(self))
        for name, wanted in conditions.items():
            column = self.values(name)
            keep = [i for i in keep if _matches(column[i], wanted)]
        return self.taken(keep)

    def taken(self, rows: Sequence[int]) -> Self:
        """The rows of these numbers, which ascend, with the ensembles they rest on."""
        columns = {name: [values[i] for i in rows] for name, values in self._columns.items()}
        return type(self)(columns, {**self.metadata, "ensembles": _still_used(self.ensembles, rows)})

    def to_pandas(self) -> pandas.DataFrame:
        """A data frame with the same columns; the metadata is in its `attrs`. Needs the extra `analysis`."""
        from sweepmill.table_convert import to_pandas

        return to_pandas(self)

    def to_xarray(self) -> dict[str, xarray.Dataset]:
        """One dataset per observation name; needs the extra `analysis`.

        Dimensions are the axes, and `layer` and `position` where they vary; combinations that the sweep does
        not have are nan. Raises ValueError if two rows fall on one place.
        """
        from sweepmill.table_convert import to_xarray

        return to_xarray(self)

    def to_arrow(self) -> Any:
        """A `pyarrow.Table` with the metadata in its schema. Needs the extra `analysis`."""
        from sweepmill.table_convert import to_arrow

        return to_arrow(self)

    def _caption(self) -> str:
        sweep = self.metadata.get("sweep")
        of_sweep = f" of sweep {short(str(sweep))}" if sweep else ""
        axes = f", axes {' × '.join(self.axes)}" if self.axes else ""
        return f"Table{of_sweep}: {len(self)} rows{axes}"

    def _shown(self, most: int) -> tuple[list[str], list[list[Any]]]:
        names = [n for n in (*self.axes, *_SHOWN) if n in self and any(v is not None for v in self.values(n))]
        return names, [[self.values(name)[i] for name in names] for i in range(min(len(self), most))]

    def text(self, most: int | None = None) -> str:
        """The columns people look at first, aligned, with all rows or the first `most`."""
        most = len(self) if most is None else most
        more = [f"… and {len(self) - most} more"] if len(self) > most else []
        return "\n".join([self._caption(), aligned(*self._shown(most)), *more])

    def __repr__(self) -> str:
        return self.text(_HEAD)

    def _repr_html_(self) -> str:
        names, rows = self._shown(_HEAD)
        more = f"; the first {_HEAD} of them" if len(self) > _HEAD else ""
        return html(names, rows, self._caption() + more)


def require_independent(*tables: Table) -> None:
    """Refuse tables that share ensembles: the same trajectories in both are not two measurements.

    Raises SharedTrajectories.
    """
    seen: set[str] = set()
    shared: set[str] = set()
    for table in tables:
        keys = {str(ensemble["key"]) for ensemble in table.ensembles}
        shared |= seen & keys
        seen |= keys
    if shared:
        raise SharedTrajectories(sorted(shared))


def _still_used(ensembles: list[dict[str, Any]], rows: Sequence[int]) -> list[dict[str, Any]]:
    """Those that some of the rows, in ascending order, rest on; with the places of their rows among these."""
    moved = ((one, [bisect_left(rows, edge) for edge in one["rows"]]) for one in ensembles)
    return [{**one, "rows": [began, ended]} for one, (began, ended) in moved if began < ended]


def _matches(value: Any, wanted: Any) -> bool:
    if isinstance(wanted, list | tuple | set | frozenset | range | np.ndarray):
        return any(_matches(value, one) for one in wanted)
    if isinstance(value, float) and isinstance(wanted, int | float | np.number):
        return math.isclose(value, wanted, rel_tol=1e-11)  # axis values have 12 significant digits
    return bool(value == wanted)
