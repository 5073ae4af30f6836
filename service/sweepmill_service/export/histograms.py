"""Exact histograms: one row per ensemble, observation, coordinate and value that occurred."""

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


def histogram_content(store: Store, key: str) -> Content:
    """Rows in the order of ensembles, observation names, coordinates, values.

    A value is one integer read off one trajectory, before any average over layers or translations.
    """
    layout = layout_of(store.specification(key), tuple(store.sweep_status(key).axes))
    rows = Rows(pa.schema([*layout.fields, *PLACE, *COUNTS]))
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
    for (place, value), number in zip(counts[:, :2].tolist(), occurrences, strict=True):
        rows.append((*constant, places[place].layer, places[place].position, value, number))
