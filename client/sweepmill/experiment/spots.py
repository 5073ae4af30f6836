"""The number of random outcomes at every depth of every ensemble, with its exact law where a histogram was kept."""

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from sweepmill.analysis.estimate import Estimate
from sweepmill.ensemble import Ensemble
from sweepmill.errors import SweepmillError
from sweepmill.experiment.law import Law
from sweepmill.experiment.source import Source
from sweepmill.table import Table

RECORD_BITS = "record-bits"
Row = Mapping[str, Any]
Place = tuple[str, str, int | None, tuple[tuple[str, Any], ...]]  # observation, ensemble, layer, values on the axes


class NoRecordBits(SweepmillError):
    """The sweep does not observe the number of random outcomes."""


@dataclass(frozen=True, eq=False)
class Spot:
    """One ensemble at one depth.

    `labels` are its values on the axes; `layer` the depth in layers (None: the end, at an unknown depth); `bits` the
    mean number of random outcomes until then, `deviation` their standard deviation over trajectories; `law` their exact
    law. `ensemble` is None where only files were given.
    """

    key: str
    labels: Mapping[str, Any]
    layer: int | None
    trajectories: int
    bits: Estimate
    deviation: float
    law: Law | None
    ensemble: Ensemble | None = None

    @property
    def place(self) -> tuple[Any, ...]:
        """What tells it from others: two observations may read the same number."""
        return self.key, tuple(self.labels.items()), self.layer


def spots_of(source: Source, name: str | None = None) -> list[Spot]:
    """All of them by ensemble, depths ascending. Raises NoRecordBits, SweepmillError for another quantity."""
    tables = [one for one in (source.table, source.histograms) if one is not None]
    names = _names(tables, name)
    laws = {} if source.histograms is None else dict(_laws(source.histograms, names))
    found: dict[tuple[Any, ...], Spot] = {}
    for spot in _spots(source, names, laws):
        if spot.place not in found or found[spot.place].law is None:
            found[spot.place] = spot
    if not found:
        raise SweepmillError(f"nothing is sampled yet of {', '.join(names)}")
    order = {place[:2]: index for index, place in reversed(list(enumerate(found)))}
    return sorted(found.values(), key=lambda one: (order[one.place[:2]], one.layer is None, one.layer or 0))


def _spots(source: Source, names: Sequence[str], laws: Mapping[Place, Law]) -> Iterator[Spot]:
    if source.table is None:
        for place, law in laws.items():
            yield _spot(source, place, law.trajectories, law.mean(), law.deviation, law)
        return
    for name in names:
        for key, row in _rows(source.table, name):
            place = _place(source.table, name, key, row)
            bits = Estimate(row["mean"], _known(row["standard_error"], math.inf))
            deviation = _known(row["variance"], 0.0) ** 0.5
            yield _spot(source, place, row["trajectories"], bits, deviation, laws.get(place))


def _known(value: float | None, otherwise: float) -> float:
    """A number that a table may leave out, as for a single trajectory."""
    return otherwise if value is None or math.isnan(value) else value


def _spot(source: Source, place: Place, number: int, bits: Estimate, deviation: float, law: Law | None) -> Spot:
    _, key, layer, axes = place
    ensemble = source.ensembles.get(key)
    depth = ensemble.layers if layer is None and ensemble is not None else layer
    return Spot(key, dict(axes), depth, number, bits, deviation, law, ensemble)


def _names(tables: Sequence[Table], name: str | None) -> list[str]:
    """The observation asked for, or all of random outcomes."""
    known: dict[str, str] = {}
    for table in tables:
        known |= dict(zip(table.values("name"), table.values("quantity"), strict=True))
    if not known:
        raise SweepmillError("nothing is sampled yet: the table has no rows")
    fitting = [one for one, quantity in known.items() if quantity == RECORD_BITS]
    if name is None and not fitting:
        raise NoRecordBits(f"no observation of {RECORD_BITS} here, only {', '.join(sorted(known))}")
    if name is not None and name not in known:
        raise SweepmillError(f"no observation {name!r}: one of {', '.join(sorted(known))}")
    if name is not None and name not in fitting:
        raise SweepmillError(f"{name!r} observes {known[name]}, and the cost of a record needs {RECORD_BITS}")
    return fitting if name is None else [name]


def _rows(table: Table, name: str) -> Iterator[tuple[str, Row]]:
    """Rows of an observation with the key of their ensemble."""
    chosen = table.where(name=name)
    rows = list(chosen.rows())
    for one in chosen.ensembles:
        began, ended = one["rows"]
        yield from ((str(one["key"]), row) for row in rows[began:ended])
    if not chosen.ensembles:  # a table without metadata, as from CSV
        yield from (("", row) for row in rows)


def _place(table: Table, name: str, key: str, row: Row) -> Place:
    return name, key, row["layer"], tuple((axis, row[axis]) for axis in table.axes)


def _laws(histograms: Table, names: Sequence[str]) -> Iterator[tuple[Place, Law]]:
    for name in names:
        counts: dict[Place, dict[int, int]] = {}
        for key, row in _rows(histograms, name):
            counts.setdefault(_place(histograms, name, key, row), {})[row["value"]] = row["occurrences"]
        numbers = _numbers(histograms, name)
        several = ((place, found) for place, found in counts.items() if sum(found.values()) > 1)
        for place, found in several:
            yield place, Law.of(list(found), list(found.values()), numbers.get(place[1]))


def _numbers(table: Table, name: str) -> dict[str, int]:
    """Trajectories behind an observation of every ensemble."""
    observation = table.metadata.get("observations", {}).get(name)
    totals = ((str(one["key"]), one["observations"].get(observation)) for one in table.ensembles)
    return {key: int(total["trajectories"][1]) for key, total in totals if total}
