"""The aggregated table: one row per ensemble, observation and coordinate."""

from collections.abc import Iterator
from itertools import islice

import pyarrow as pa

from sweepmill.sweep import NamedObservation
from sweepmill_service.export.content import Content, Rows
from sweepmill_service.export.layout import PLACE, Layout, layout_of
from sweepmill_service.export.metadata import Provenance
from sweepmill_service.export.moments import moments_of
from sweepmill_service.store import Store, TableEntry

ENSEMBLES_AT_ONCE = 200
RESULTS = (
    pa.field("trajectories", pa.int64()),
    *(pa.field(name, pa.float64()) for name in ("mean", "standard_error", "variance", "minimum", "maximum")),
    pa.field("met_by", pa.string()),
)


def table_content(store: Store, key: str) -> Content:
    """Rows in the order of ensembles, then observation names, then coordinates."""
    layout = layout_of(store.specification(key), tuple(store.sweep_status(key).axes))
    rows = Rows(pa.schema([*layout.fields, *PLACE, *RESULTS]))
    provenance = Provenance(key, layout, store.frozen_digests(key))
    ensembles = by_ensemble(store.table_entries(key))
    while chunk := list(islice(ensembles, ENSEMBLES_AT_ONCE)):
        _add_chunk(rows, provenance, layout, chunk)
    return Content(rows.schema, rows.finished(), provenance.metadata(), provenance.version())


def by_ensemble(entries: Iterator[TableEntry]) -> Iterator[tuple[int, list[TableEntry]]]:
    """The entries of each ensemble together."""
    held: list[TableEntry] = []
    for entry in entries:
        if held and held[0].ordinal != entry.ordinal:
            yield held[0].ordinal, held
            held = []
        held.append(entry)
    if held:
        yield held[0].ordinal, held


def sampled(layout: Layout, entries: list[TableEntry]) -> Iterator[tuple[NamedObservation, TableEntry, bytes]]:
    """Named observations that have trajectories, in the order of the names, with their totals."""
    found = {entry.observation_key: entry for entry in entries}
    for item, key in layout.observation_keys:
        entry = found[key]
        if entry.accumulator is not None:
            yield item, entry, entry.accumulator


def _add_chunk(rows: Rows, provenance: Provenance, layout: Layout, chunk: list[tuple[int, list[TableEntry]]]) -> None:
    found = [list(sampled(layout, entries)) for _, entries in chunk]
    places = [[layout.coordinates(entry.ordinal, item) for item, entry, _ in one] for one in found]
    flat = zip((total for one in found for _, _, total in one), (place for one in places for place in one), strict=True)
    moments = iter(moments_of(list(flat)))
    for (ordinal, entries), one, where in zip(chunk, found, places, strict=True):
        began = rows.count
        axes = layout.axis_values(ordinal)
        for (item, entry, _), coordinates in zip(one, where, strict=True):
            constant = (*axes, *layout.labels[item.name])
            for place, numbers in zip(coordinates, next(moments).tolist(), strict=True):
                rows.append((*constant, place.layer, place.position, entry.trajectories, *numbers, entry.met_by))
        provenance.note(ordinal, entries, began, rows.count)
