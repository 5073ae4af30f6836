"""What the columns of a sweep's tables are, and which values its axes take on each ensemble."""

from functools import lru_cache
from typing import Any

import pyarrow as pa

from sweepmill.coordinates import Coordinate, coordinates
from sweepmill.ensemble import Ensemble
from sweepmill.sweep import NamedObservation
from sweepmill_service.stored import StoredSweep, expand

PLACE = (
    pa.field("name", pa.string()),
    pa.field("quantity", pa.string()),
    pa.field("region", pa.string()),
    pa.field("layer", pa.int64()),
    pa.field("position", pa.int64()),
)


class Layout:
    """Columns common to the tables of one sweep."""

    def __init__(self, sweep: StoredSweep, axes: tuple[str, ...]) -> None:
        self.sweep = sweep
        self.axes = axes
        self.fields = [pa.field(axis, _type([self._value(e, axis) for e in sweep.ensembles])) for axis in axes]
        self.constants = _constants(sweep.ensembles)
        self.observation_keys = [(item, item.observation.key) for item in sweep.observations]
        self.labels = {item.name: _labels(item) for item in sweep.observations}
        self._coordinates: dict[tuple[Any, ...], tuple[Coordinate, ...]] = {}

    @staticmethod
    def _value(ensemble: Ensemble, axis: str) -> Any:
        return ensemble.family if axis == "family" else ensemble.columns.get(axis)

    def axis_values(self, ordinal: int) -> list[Any]:
        """Value of every axis on an ensemble; None where it has no such parameter."""
        ensemble = self.sweep.ensembles[ordinal]
        return [self._value(ensemble, axis) for axis in self.axes]

    def coordinates(self, ordinal: int, item: NamedObservation) -> tuple[Coordinate, ...]:
        """Coordinates in the order of the accumulator, worked out once for each shape."""
        ensemble = self.sweep.ensembles[ordinal]
        key = (item.name, *ensemble.shape)
        if key not in self._coordinates:
            self._coordinates[key] = coordinates(ensemble, item.observation)
        return self._coordinates[key]


def _labels(item: NamedObservation) -> tuple[str, str, str]:
    """Name, quantity and region."""
    return item.name, item.observation.quantity, item.observation.region_label()


@lru_cache(maxsize=4)
def layout_of(specification: str, axes: tuple[str, ...]) -> Layout:
    """Layout for a sweep's canonical JSON."""
    return Layout(expand(specification), axes)


def _constants(ensembles: tuple[Ensemble, ...]) -> dict[str, Any]:
    """What all ensembles have in common, the family included: the columns that no axis can show."""
    columns = [{"family": ensemble.family, **ensemble.columns} for ensemble in ensembles]
    return {name: value for name, value in columns[0].items() if all(name in c and c[name] == value for c in columns)}


def _type(values: list[Any]) -> pa.DataType:
    present = [value for value in values if value is not None]
    if all(isinstance(value, int) for value in present):
        return pa.int64()
    return pa.float64() if all(isinstance(value, int | float) for value in present) else pa.string()
