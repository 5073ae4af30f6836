"""Tables as pandas, xarray and Arrow objects."""

from __future__ import annotations

import json
import math
from typing import TYPE_CHECKING, Any

import numpy as np
from numpy.typing import NDArray

from sweepmill.extras import needing
from sweepmill.table import COUNTS, INTEGERS, PLACE, REALS, Table

if TYPE_CHECKING:
    import pandas
    import xarray

ARROW_METADATA = b"sweepmill"


def to_pandas(table: Table) -> pandas.DataFrame:
    """A data frame; whole-number columns that may be empty are nullable integers."""
    with needing("to_pandas()", "analysis"):
        import pandas as pd
    frame = pd.DataFrame({name: table.values(name) for name in table.columns})
    kinds = dict.fromkeys((*INTEGERS, *COUNTS), "Int64") | dict.fromkeys(REALS, "float64")
    frame = frame.astype({name: kind for name, kind in kinds.items() if name in frame})
    frame.attrs.update(table.metadata)
    return frame


def to_arrow(table: Table) -> Any:
    """A `pyarrow.Table`, typed by column, the metadata as JSON in its schema."""
    with needing("to_arrow()", "analysis"):
        import pyarrow as pa
    kinds = {name: pa.int64() for name in (*INTEGERS, *COUNTS)} | {name: pa.float64() for name in REALS}
    arrays = {name: pa.array(table.values(name), type=kinds.get(name)) for name in table.columns}
    return pa.table(arrays).replace_schema_metadata({ARROW_METADATA: json.dumps(table.metadata)})


def to_xarray(table: Table) -> dict[str, xarray.Dataset]:
    """One dataset per observation name."""
    with needing("to_xarray()", "analysis"):
        import xarray as xr
    names = dict.fromkeys(table.values("name"))
    return {str(name): _dataset(table.where(name=name), xr.Dataset) for name in names}


def _dataset(table: Table, kind: type[xarray.Dataset]) -> xarray.Dataset:
    varying = [name for name in ("layer", "position", "value") if name in table and len(set(table.values(name))) > 1]
    dimensions = [*table.axes, *varying]
    coordinates = {name: sorted(set(table.values(name)), key=_order) for name in dimensions}
    shape = tuple(map(len, coordinates.values()))
    places = _places(table, coordinates)
    results = [name for name in table.columns if name not in (*dimensions, *PLACE)]
    grids = {name: (dimensions, _grid(table.values(name), places, shape)) for name in results}
    dataset = kind(grids, coords=coordinates)
    constant = {name: table.values(name)[0] for name in PLACE if name not in dimensions}
    constant["sweep"] = table.metadata.get("sweep")
    dataset.attrs.update({name: value for name, value in constant.items() if value is not None})
    return dataset


def _grid(values: list[Any], places: list[tuple[int, ...]], shape: tuple[int, ...]) -> NDArray[Any]:
    """Values at their places: texts as objects with None for what is absent, numbers as floats with nan."""
    texts = any(isinstance(value, str) for value in values)
    grid: NDArray[Any] = np.full(shape, None if texts else math.nan, dtype=object if texts else np.float64)
    for place, value in zip(places, values, strict=True):
        grid[place] = value  # numpy turns None into nan in an array of floats
    return grid


def _places(table: Table, coordinates: dict[str, list[Any]]) -> list[tuple[int, ...]]:
    """Index of every row in the grid. Raises ValueError if two rows have the same."""
    index = {name: {value: i for i, value in enumerate(values)} for name, values in coordinates.items()}
    places = [tuple(index[name][row[name]] for name in coordinates) for row in table.rows()]
    if len(set(places)) < len(places):
        raise ValueError("two rows fall on one place of the grid: the axes do not tell the ensembles apart")
    return places


def _order(value: Any) -> tuple[bool, str, Any]:
    """Numbers by size, texts by alphabet, None last."""
    kind = "" if isinstance(value, int | float) else type(value).__name__
    return value is None, kind, 0 if value is None else value
