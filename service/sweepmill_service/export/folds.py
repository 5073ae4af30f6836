"""Sums over folds of trajectories: the table's rows with what a jackknife and a fit need."""

from collections.abc import Callable
from functools import partial
from http import HTTPStatus

import numpy as np
import pyarrow as pa

from sweepmill.accumulate import Accumulator
from sweepmill.errors import Fault
from sweepmill.folds import fold_ratios
from sweepmill_service.export.content import ROWS_PER_BATCH, Content, Rows
from sweepmill_service.export.layout import PLACE, Layout, layout_of
from sweepmill_service.export.metadata import Provenance
from sweepmill_service.export.moments import moments_of
from sweepmill_service.export.tables import by_ensemble, sampled
from sweepmill_service.problems import Refusal
from sweepmill_service.store import Store, TableEntry

RESULTS = (
    pa.field("trajectories", pa.int64()),
    pa.field("mean", pa.float64()),
    pa.field("standard_error", pa.float64()),
)
SUMS = tuple(pa.field(name, pa.list_(pa.float64())) for name in ("numerators", "denominators"))


class FoldRows(Rows):
    """Rows that end in two lists, kept as arrays: a list of Python numbers would be ten times as large."""

    def __init__(self, layout: Layout) -> None:
        super().__init__(pa.schema([*layout.fields, *PLACE, *RESULTS]))
        self.complete = pa.schema([*self.schema, *SUMS])
        self._sums: tuple[list[np.ndarray], list[np.ndarray]] = ([], [])
        self._lengths: list[int] = []

    def add_sums(self, numerators: np.ndarray, denominators: np.ndarray) -> None:
        """The sums [F, C] of the C rows appended last."""
        for held, values in zip(self._sums, (numerators, denominators), strict=True):
            held.append(values.T.ravel())
        self._lengths += [len(numerators)] * numerators.shape[1]
        if len(self._lengths) >= ROWS_PER_BATCH:
            self._flush()

    def append(self, row: tuple[object, ...]) -> None:
        """Add the plain values of one row; its sums follow with those of its total."""
        self._pending.append(row)
        self.count += 1

    def _flush(self) -> None:
        super()._flush()
        plain, offsets = self.batches.pop(), np.concatenate([[0], np.cumsum(self._lengths)]).astype(np.int32)
        lists = [pa.ListArray.from_arrays(offsets, np.concatenate(held)) for held in self._sums]
        self.batches.append(pa.record_batch([*plain.columns, *lists], schema=self.complete))
        self._sums, self._lengths = ([], []), []


def folds_of(name: str | None) -> Callable[[Store, str], Content]:
    """The function that collects the rows of one observation, or of all."""
    return partial(fold_content, name=name)


def fold_content(store: Store, key: str, name: str | None) -> Content:
    """Rows in the order of the table. Raises Refusal (422) for a name that the sweep does not have."""
    layout = layout_of(store.specification(key), tuple(store.sweep_status(key).axes))
    if name is not None and name not in layout.labels:
        raise Refusal(
            HTTPStatus.UNPROCESSABLE_ENTITY,
            f"no observation is named {name!r}",
            [Fault("query.name", f"{name!r} is none of {', '.join(layout.labels)}")],
        )
    rows = FoldRows(layout)
    provenance = Provenance(key, layout, store.frozen_digests(key))
    for ordinal, entries in by_ensemble(store.table_entries(key)):
        began = rows.count
        _add(rows, layout, ordinal, entries, name)
        provenance.note(ordinal, entries, began, rows.count)
    return Content(rows.complete, rows.finished(), provenance.metadata(), provenance.version())


def _add(rows: FoldRows, layout: Layout, ordinal: int, entries: list[TableEntry], name: str | None) -> None:
    axes = layout.axis_values(ordinal)
    for item, entry, total in sampled(layout, entries):
        if name not in (None, item.name):
            continue
        places = layout.coordinates(ordinal, item)
        (moments,) = moments_of([(total, places)])
        constant = (*axes, *layout.labels[item.name])
        for place, (mean, error) in zip(places, moments[:, :2].tolist(), strict=True):
            rows.append((*constant, place.layer, place.position, entry.trajectories, mean, error))
        rows.add_sums(*fold_ratios(Accumulator.from_bytes(total), places))
