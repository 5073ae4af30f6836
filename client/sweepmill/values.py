"""Values of single trajectories: what an observation with ``keep_values`` read off each of them."""

from __future__ import annotations

import json
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING, Any, Self

import numpy as np
from numpy.typing import NDArray

from sweepmill.accumulate import Accumulator
from sweepmill.errors import SweepmillError
from sweepmill.extras import needing
from sweepmill.table_convert import ARROW_METADATA
from sweepmill.table_files import arrow_table, media_type
from sweepmill.text import count, short

if TYPE_CHECKING:
    import pandas

FORMATS = (".parquet", ".arrow", ".csv")
RATIO = ("numerator", "denominator")
_PLACE = ("layer", "position", "trajectory", "value", *RATIO)


class Values:
    """Values of one observation, a row per ensemble, trajectory and coordinate; needs the extra `analysis`.

    Columns: the axes of the sweep, `layer`, `position`, `trajectory` (the number k of the trajectory within its
    ensemble), and `value`, or `numerator` and `denominator` of a ratio. Two observations of one sweep are read off
    the same trajectories: rows of equal axes and `trajectory` belong together.
    """

    def __init__(self, arrow: Any) -> None:
        self._arrow = arrow
        stored = (arrow.schema.metadata or {}).get(ARROW_METADATA, b"{}")
        self.metadata: dict[str, Any] = json.loads(stored)
        if "trajectory" not in arrow.column_names or "ensembles" not in self.metadata:
            raise SweepmillError("this is not a table of kept values with its metadata")

    @classmethod
    def read(cls, path: str | Path) -> Self:
        """Read a .parquet or .arrow file that `RemoteSweep.download_values` wrote; CSV has no metadata."""
        media_type(Path(path))
        return cls(arrow_table(Path(path)))

    @property
    def name(self) -> str:
        """Name of the observation."""
        return str(self.metadata["name"])

    @property
    def axes(self) -> tuple[str, ...]:
        """Names of the columns that are axes of the sweep."""
        return tuple(name for name in self._arrow.column_names if name not in _PLACE)

    @cached_property
    def ensembles(self) -> list[dict[str, Any]]:
        """Every ensemble in table order: `key`, `ordinal`, half-open range of `rows`, and its axes as `axes`."""
        return [{**entry, "axes": self._axes_of(entry)} for entry in self.metadata["ensembles"]]

    def __len__(self) -> int:
        return int(self._arrow.num_rows)

    def __repr__(self) -> str:
        axes = f", axes {' × '.join(self.axes)}" if self.axes else ""
        sweep = short(str(self.metadata["sweep"]))
        return f"Values of {self.name} of sweep {sweep}: {count(len(self))} rows{axes}"

    def to_arrow(self) -> Any:
        """A `pyarrow.Table` with the metadata in its schema."""
        return self._arrow

    def to_pandas(self) -> pandas.DataFrame:
        """A data frame with the same columns; the metadata is in its `attrs`."""
        with needing("to_pandas()", "analysis"):
            import pandas as pd
        kinds = {"layer": "Int64", "position": "Int64", "trajectory": "int64"}
        frame = pd.DataFrame(self._arrow.to_pandas()).astype(kinds)
        frame.attrs.update(self.metadata)
        return frame

    def to_numpy(self, **axes: Any) -> NDArray[Any]:
        """Values [trajectories, coordinates] of one ensemble; of a ratio, its integers [trajectories, coordinates, 2].

        `axes` picks the ensemble where there are several. Raises ValueError unless exactly one fits.
        """
        entry = self._entry(axes)
        return self._columns(entry, ("value",))[:, :, 0] if "value" in self._arrow.column_names else self._ratio(entry)

    def total(self, **axes: Any) -> Accumulator:
        """The accumulator of the values of one ensemble, chosen as in `to_numpy`: that of its table, bit for bit.

        It has no histogram: that counts single readings, before they are averaged over layers and translations.
        """
        entry = self._entry(axes)
        if "value" not in self._arrow.column_names:
            return Accumulator.from_values(self._ratio(entry), 0)
        scale = np.array(self.metadata["scales"][entry["scales"]], dtype=np.float64)
        scaled = self._columns(entry, ("value",))[:, :, 0] * scale
        return Accumulator.from_values(np.rint(scaled).astype(np.int64), 0)

    def _ratio(self, entry: dict[str, Any]) -> NDArray[Any]:
        return self._columns(entry, RATIO)

    def _columns(self, entry: dict[str, Any], names: tuple[str, ...]) -> NDArray[Any]:
        begin, end = entry["rows"]
        part = self._arrow.slice(begin, end - begin)
        coordinates = len(self.metadata["scales"][entry["scales"]])
        columns = [part[name].to_numpy().reshape(-1, coordinates) for name in names]
        return np.stack(columns, axis=-1)

    def _entry(self, axes: dict[str, Any]) -> dict[str, Any]:
        if unknown := [name for name in axes if name not in self.axes]:
            raise ValueError(f"{', '.join(unknown)}: not an axis; the axes are {', '.join(self.axes) or 'none'}")
        sampled = [entry for entry in self.ensembles if entry["rows"][0] < entry["rows"][1]]
        fitting = [entry for entry in sampled if all(entry["axes"][name] == value for name, value in axes.items())]
        if len(fitting) != 1:
            raise ValueError(f"{len(fitting)} of {len(sampled)} ensembles fit: pick one by its axes")
        return fitting[0]

    def _axes_of(self, entry: dict[str, Any]) -> dict[str, Any]:
        begin, end = entry["rows"]
        return {} if begin == end else {name: self._arrow[name][begin].as_py() for name in self.axes}
