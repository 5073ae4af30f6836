"""A sweep sampled here, as the table and the histograms that a service would give of it."""

from typing import Any

from sweepmill import Sweep, Table
from sweepmill.coordinates import coordinates
from sweepmill.experiment import Source
from sweepmill.statistics import summarize
from sweepmill_worker.sample import sample

Rows = list[dict[str, Any]]


def sampled_source(sweep: Sweep, trajectories: int) -> Source:
    """Every ensemble of a sweep with so many trajectories."""
    rows: Rows = []
    counts: Rows = []
    notes: tuple[list[dict[str, Any]], list[dict[str, Any]]] = ([], [])
    for point in sweep.points:
        began = len(rows), len(counts)
        batch = sample(point.ensemble, [item.observation for item in sweep.observations], 0, trajectories)
        known = {"family": point.ensemble.family, **point.ensemble.columns}
        axes = {name: known.get(name) for name in sweep.axes}
        for item in sweep.observations:
            total, places = batch.accumulators[item.observation.key], coordinates(point.ensemble, item.observation)
            named = {
                "name": item.name,
                "quantity": item.observation.quantity,
                "region": item.observation.region_label(),
            }
            at = [axes | named | {"layer": place.layer, "position": place.position} for place in places]
            for place, moments in zip(at, summarize(total, places), strict=True):
                shown = {name: getattr(moments, name) for name in ("mean", "standard_error", "variance")}
                rows.append(place | {"trajectories": total.count} | shown)
            found = [] if total.histogram is None else total.histogram.tolist()
            counts += [at[place] | {"value": value, "occurrences": sum(folds)} for place, value, *folds in found]
        totals = {item.observation.key: {"trajectories": [0, trajectories]} for item in sweep.observations}
        for note, first, last in zip(notes, began, (len(rows), len(counts)), strict=True):
            note.append({"key": point.ensemble.key, "rows": [first, last], "observations": totals})
    metadata = {"sweep": sweep.key, "observations": {i.name: i.observation.key for i in sweep.observations}}
    tables = [Table(_columns(part), metadata | {"ensembles": n}) for part, n in zip((rows, counts), notes, strict=True)]
    ensembles = {point.ensemble.key: point.ensemble for point in sweep.points}
    return Source(tables[0], tables[1] if counts else None, ensembles, sweep.key)


def _columns(rows: Rows) -> dict[str, list[Any]]:
    return {name: [row[name] for row in rows] for name in rows[0]} if rows else {}
