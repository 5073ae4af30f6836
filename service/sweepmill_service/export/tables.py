"""The aggregated table: one row per ensemble, observation and coordinate."""

from collections.abc import Iterator

import pyarrow as pa

from sweepmill.accumulate import Accumulator
from sweepmill.statistics import summarize
from sweepmill.sweep import NamedObservation
from sweepmill_service.export.content import Content, Rows
from sweepmill_service.export.heads import read_head
from sweepmill_service.export.layout import PLACE, Layout, layout_of
from sweepmill_service.export.metadata import Provenance
from sweepmill_service.store import Store, TableEntry

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
    for ordinal, entries in by_ensemble(store.table_entries(key)):
        began = rows.count
        for item, entry, total in sampled(layout, entries):
            _add(rows, layout, item, entry, read_head(total))
        provenance.note(ordinal, entries, began, rows.count)
    return Content(rows.schema, rows.finished(), provenance.metadata())


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


def _add(rows: Rows, layout: Layout, item: NamedObservation, entry: TableEntry, accumulator: Accumulator) -> None:
    places = layout.coordinates(entry.ordinal, item)
    constant = [*layout.axis_values(entry.ordinal), *layout.labels[item.name]]
    rows.extend(
        constant,
        [
            (
                place.layer,
                place.position,
                entry.trajectories,
                moments.mean,
                moments.standard_error,
                moments.variance,
                moments.minimum,
                moments.maximum,
                entry.met_by,
            )
            for place, moments in zip(places, summarize(accumulator, places), strict=True)
        ],
    )
