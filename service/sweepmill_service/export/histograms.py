"""Exact histograms: one row per ensemble, observation, coordinate and value that occurred."""

from itertools import repeat

import pyarrow as pa

from sweepmill.accumulate import Accumulator
from sweepmill.counts import Rows as CountRows
from sweepmill.sweep import NamedObservation
from sweepmill_service.export.content import Content, Rows
from sweepmill_service.export.layout import PLACE, Layout, layout_of
from sweepmill_service.export.metadata import Provenance
from sweepmill_service.export.tables import by_ensemble, sampled
from sweepmill_service.store import Store

COUNTS = (pa.field("value", pa.int64()), pa.field("occurrences", pa.int64()))
BY_FOLD = pa.field("by_fold", pa.list_(pa.int64()))


def histogram_content(store: Store, key: str, by_fold: bool = False) -> Content:
    """Rows in the order of ensembles, observation names, coordinates, values; occurrences in each fold where wanted.

    A value is one integer read off one trajectory, before any average over layers or translations.
    """
    layout = layout_of(store.specification(key), tuple(store.sweep_status(key).axes))
    rows = Rows(pa.schema([*layout.fields, *PLACE, *COUNTS, *([BY_FOLD] if by_fold else [])]))
    provenance = Provenance(key, layout, store.frozen_digests(key))
    for ordinal, entries in by_ensemble(store.table_entries(key)):
        began = rows.count
        for item, _, total in sampled(layout, entries):
            _add(rows, layout, ordinal, item, Accumulator.from_bytes(total).histogram)
        provenance.note(ordinal, entries, began, rows.count)
    return Content(rows.schema, rows.finished(), provenance.metadata(), provenance.version())


def _add(rows: Rows, layout: Layout, ordinal: int, item: NamedObservation, counts: CountRows | None) -> None:
    if counts is None:
        return
    places = layout.coordinates(ordinal, item)
    constant = (*layout.axis_values(ordinal), *layout.labels[item.name])
    occurrences = counts[:, 2:].sum(axis=1).tolist()
    folds = ([row] for row in counts[:, 2:].tolist()) if BY_FOLD in rows.schema else repeat([])
    for (place, value), number, by_fold in zip(counts[:, :2].tolist(), occurrences, folds, strict=False):
        rows.append((*constant, places[place].layer, places[place].position, value, number, *by_fold))
