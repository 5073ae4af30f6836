"""Kept values of one observation: a row per ensemble, trajectory and coordinate, made while they are sent.

Rows and record batches depend on nothing but the N of each ensemble, so equal answers have equal bytes however the
trajectories were cut into batches.
"""

from collections.abc import Iterable, Iterator, Sequence
from functools import partial
from http import HTTPStatus
from importlib.metadata import version
from typing import Any, NamedTuple

import numpy as np
import pyarrow as pa
import pyarrow.parquet
from numpy.typing import NDArray

from sweepmill.coordinates import Coordinate
from sweepmill.errors import Fault
from sweepmill.revisions import all_revisions
from sweepmill.sweep import NamedObservation
from sweepmill_service.export.content import Content
from sweepmill_service.export.formats import WRITERS, Writer, streamed, with_metadata
from sweepmill_service.export.layout import Layout, layout_of
from sweepmill_service.problems import Refusal
from sweepmill_service.store import Store
from sweepmill_service.store.tables import Number, version_of
from sweepmill_service.store.values import KeptEntry
from sweepmill_worker.kept import unpack

ROWS = 65_536  # of one record batch, about
PLACE = (pa.field("layer", pa.int64()), pa.field("position", pa.int64()), pa.field("trajectory", pa.int64()))
VALUE = (pa.field("value", pa.float64()),)
RATIO = (pa.field("numerator", pa.int64()), pa.field("denominator", pa.int64()))


class Kept(NamedTuple):
    """What is served of one observation: its layout and the N of every ensemble."""

    sweep: str
    layout: Layout
    item: NamedObservation
    entries: list[KeptEntry]

    @classmethod
    def find(cls, store: Store, sweep: str, name: str | None) -> "Kept":
        """Raises Refusal where no observation of that name keeps its values."""
        layout = layout_of(store.specification(sweep), tuple(store.sweep_status(sweep).axes))
        item = _chosen(layout.sweep.observations, name)
        return cls(sweep, layout, item, store.kept_entries(sweep, item.observation.key))

    def version(self) -> str:
        """Changes with the N of any ensemble."""
        key = self.item.observation.key
        return version_of(self.sweep, (Number(e.ordinal, key, e.trajectories, e.met_by) for e in self.entries))

    def content(self, store: Store) -> Content:
        """Record batches, read from the store while they are taken."""
        results = RATIO if self.item.observation.COMPONENTS == 2 else VALUE
        schema = pa.schema([*self.layout.fields, *PLACE, *results])
        metadata = self._metadata(store.frozen_digests(self.sweep))
        return Content(schema, _gathered(self._pieces(store, schema)), metadata, self.version())

    def _metadata(self, frozen: dict[str, str]) -> dict[str, Any]:
        """As that of tables; besides, integer = value x scale, with a list of scales by coordinate for each shape."""
        observation, scales = self.item.observation, dict[tuple[int, ...], int]()
        ensembles: list[dict[str, Any]] = []
        row = 0
        for entry in self.entries:
            places = tuple(place.scale for place in self.layout.coordinates(entry.ordinal, self.item))
            ended = row + entry.trajectories * len(places)
            total = {"trajectories": [0, entry.trajectories], "digest": entry.digest}
            ensembles.append(
                {
                    "key": entry.ensemble_key,
                    "ordinal": entry.ordinal,
                    "rows": [row, ended],
                    "frozen": entry.met_by is not None,
                    "digest": frozen.get(entry.ensemble_key) if entry.met_by is not None else None,
                    "observations": {observation.key: total},
                    "scales": scales.setdefault(places, len(scales)),
                }
            )
            row = ended
        return {
            "sweep": self.sweep,
            "axes": list(self.layout.axes),
            "name": self.item.name,
            "observation": observation.normal_form(),
            "observations": {self.item.name: observation.key},
            "version": version("sweepmill"),
            "revisions": all_revisions(),
            "scales": [list(places) for places in scales],
            "ensembles": ensembles,
        }

    def _pieces(self, store: Store, schema: pa.Schema) -> Iterator[pa.RecordBatch]:
        for entry in self.entries:
            places = self.layout.coordinates(entry.ordinal, self.item)
            axes = self.layout.axis_values(entry.ordinal)
            chunks = store.kept_chunks(entry.ensemble_key, self.item.observation.key, entry.trajectories)
            arrays = (unpack(chunk.data) for chunk in chunks)
            first = 0
            for values in _evenly(arrays, max(1, ROWS // len(places)), entry.trajectories):
                yield _rows(schema, axes, places, first, values)
                first += len(values)


def _chosen(observations: Sequence[NamedObservation], name: str | None) -> NamedObservation:
    keeping = {item.name: item for item in observations if item.observation.keep_values}
    names = ", ".join(keeping) or "none"
    if name is None and len(keeping) == 1:
        return next(iter(keeping.values()))
    if name in keeping:
        return keeping[name]
    if name is None:
        said = f"name one of the observations that keep their values: {names}"
    elif name in (item.name for item in observations):
        said = f"{name} does not keep its values (keep_values = true does); those that do: {names}"
    else:
        said = f"no observation is called {name}; those that keep their values: {names}"
    raise Refusal(HTTPStatus.UNPROCESSABLE_ENTITY, said, [Fault("query.name", said)])


def _evenly(arrays: Iterable[NDArray[np.int64]], size: int, number: int) -> Iterator[NDArray[np.int64]]:
    """The same ``number`` trajectories in pieces of ``size``, the last one shorter."""
    held: list[NDArray[np.int64]] = []
    count = taken = 0
    for array in arrays:
        held.append(array)
        count += len(array)
        if count >= size:
            whole = np.concatenate(held)
            edges = range(0, count - count % size, size)
            for begin in edges:
                yield whole[begin : begin + size][: number - taken - begin]
            held, taken, count = [whole[len(edges) * size :]], taken + len(edges) * size, count % size
    rest = np.concatenate(held)[: number - taken] if held else None
    if rest is not None and len(rest):
        yield rest


def _rows(
    schema: pa.Schema, axes: list[Any], places: Sequence[Coordinate], first: int, values: NDArray[np.int64]
) -> pa.RecordBatch:
    """All coordinates of one trajectory after the other."""
    count, coordinates, components = values.shape
    size = count * coordinates
    constant = [pa.repeat(pa.scalar(value, field.type), size) for value, field in zip(axes, schema, strict=False)]
    where = [_repeated([getattr(place, name) for place in places], count) for name in ("layer", "position")]
    trajectories = pa.array(np.repeat(np.arange(first, first + count, dtype=np.int64), coordinates))
    if components == 2:
        results = [pa.array(values[:, :, i].ravel()) for i in range(2)]
    else:
        scale = np.array([place.scale for place in places], dtype=np.int64)
        results = [pa.array((values[:, :, 0] / scale).ravel())]
    return pa.record_batch([*constant, *where, trajectories, *results], schema=schema)


def _repeated(numbers: list[int | None], times: int) -> pa.Array:
    if None in numbers:  # one has no meaning, so none has
        return pa.nulls(len(numbers) * times, pa.int64())
    return pa.array(np.tile(np.array(numbers, dtype=np.int64), times))


def _gathered(pieces: Iterator[pa.RecordBatch]) -> Iterator[pa.RecordBatch]:
    """Record batches of at least some size, over the bounds of ensembles."""
    held: list[pa.RecordBatch] = []
    for piece in pieces:
        held.append(piece)
        if sum(one.num_rows for one in held) >= ROWS:
            yield pa.concat_batches(held)
            held = []
    if held:
        yield pa.concat_batches(held)


def _write_parquet(content: Content) -> Iterator[bytes]:
    """Numbers of trajectories as differences, everything else as indices of its few values."""
    names = [name for name in content.schema.names if name != "trajectory"]
    options = {"use_dictionary": names, "column_encoding": {"trajectory": "DELTA_BINARY_PACKED"}, "compression": "zstd"}
    return streamed(content, with_metadata(content), partial(pyarrow.parquet.ParquetWriter, **options))


VALUE_WRITERS: dict[str, Writer] = {
    "arrow": WRITERS["arrow"],
    "parquet": _write_parquet,
    "csv": WRITERS["csv"],
}
