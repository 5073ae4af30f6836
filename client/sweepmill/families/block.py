"""What all circuit blocks share: columns of values, and their expansion into ensembles."""

from collections.abc import Iterator, Mapping
from itertools import product
from math import prod
from typing import Annotated, Any, ClassVar

from pydantic import BaseModel, ConfigDict, Field

from sweepmill.axes import Integer, IntegerAxis, located_values
from sweepmill.ensemble import FAMILY_PARAMETERS, PROGRAM, Ensemble
from sweepmill.errors import Fault
from sweepmill.families.checks import RANGES, Check
from sweepmill.families.fields import EngineAxis, PerSide, PerSite, resolved_layers

MOST_ENSEMBLES = 1_000_000  # a guard against slips of the pen; servers take fewer
Values = list[tuple[str, Any]]


class Block(BaseModel):
    """A circuit family with values for its fields; the subclasses add the fields of their family."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    SIZE: ClassVar[str] = "sites"
    """The field that observations which do not fit are blamed on."""
    CHECKS: ClassVar[tuple[Check, ...]] = ()

    family: str
    layers: Any
    replicate: IntegerAxis = 0
    engine: EngineAxis = "auto"
    trajectories: Annotated[Integer, Field(ge=1)] | None = None

    def ensembles(self, path: str, faults: list[Fault]) -> Iterator[tuple[str, Ensemble]]:
        """Every valid ensemble of the block with the path to blame; faults found on the way are appended."""
        columns = self.columns(path, faults)
        if (size := prod(map(len, columns.values()))) > MOST_ENSEMBLES:
            faults.append(Fault(path, f"a block has at most {MOST_ENSEMBLES} ensembles, the axes multiply to {size}"))
            return
        refused = [(check.fields, _failing(check, columns, faults)) for check in self.CHECKS]
        layers = self._layer_numbers(columns, faults)
        at = list(columns).index(self.SIZE)
        for combination in product(*columns.values()):
            values = {name: value for name, (_, value) in zip(columns, combination, strict=True)}
            number = layers.get((self.extent(values), values["layers"]))
            if number is not None and not any(tuple(map(values.get, names)) in bad for names, bad in refused):
                ensemble = self.ensemble(values | {"layers": number}, path, faults)
                if ensemble is not None:
                    yield combination[at][0], ensemble

    def columns(self, path: str, faults: list[Fault]) -> dict[str, Values]:
        """All values of every field in the order of a table; the invalid ones become faults and are left out."""
        return {name: column(getattr(self, name), name, f"{path}.{name}", faults) for name in self._fields()}

    def _fields(self) -> list[str]:
        return [name for name in FAMILY_PARAMETERS[self.family] if name not in PROGRAM]

    def extent(self, values: Mapping[str, Any]) -> int:
        """What a number of layers can be proportional to."""
        return int(values["sites"])

    def _extents(self, columns: Mapping[str, Values]) -> list[int]:
        return list(dict.fromkeys(self.extent({"sites": sites}) for _, sites in columns["sites"]))

    def _layer_numbers(self, columns: Mapping[str, Values], faults: list[Fault]) -> dict[tuple[int, Any], int]:
        """Numbers of layers by extent and value; a ``per_site`` that gives none becomes a fault."""
        resolved: dict[tuple[int, Any], int] = {}
        for extent, (where, layers) in product(self._extents(columns), columns["layers"]):
            try:
                resolved[extent, layers] = resolved_layers(layers, extent)
            except ValueError as error:
                faults.append(Fault(where, str(error)))
        return resolved

    def ensemble(self, values: dict[str, Any], path: str, faults: list[Fault]) -> Ensemble | None:
        """The ensemble of one value of every field; None if there is none, with faults."""
        return Ensemble.of(self.family, **values)

    def normal_form(self, cap: int) -> dict[str, Any]:
        """The block with its axes expanded, ``per_site`` resolved where there is one size, and defaults omitted."""
        form: dict[str, Any] = {"family": self.family}
        columns = {name: [value for _, value in located_values(getattr(self, name), "")] for name in self._fields()}
        extents = self._extents({name: [("", value) for value in values] for name, values in columns.items()})
        columns["layers"] = [_normal_layers(value, extents) for value in columns["layers"]]
        for name, values in columns.items():
            if values != [FAMILY_PARAMETERS[self.family][name]]:
                form[name] = values[0] if len(values) == 1 else values
        if self.trajectories not in (None, cap):
            form["trajectories"] = self.trajectories
        return form


def column(axis: Any, name: str, path: str, faults: list[Fault]) -> Values:
    """All values of one field; the invalid ones become faults and are left out."""
    try:
        located = located_values(axis, path)
    except ValueError as error:
        faults.append(Fault(path, str(error)))
        return []
    kept: dict[Any, str] = {}
    for where, value in located:
        message = RANGES[name](value) if name in RANGES else None
        if message is None and value in kept:
            message = f"the value {value} stands in this axis already"
        if message is not None:
            faults.append(Fault(where, message))
        else:
            kept[value] = where
    return [(where, value) for value, where in kept.items()]


def _failing(check: Check, columns: Mapping[str, Values], faults: list[Fault]) -> set[tuple[Any, ...]]:
    """Values that do not pass together; a fault for each value of the blamed field that is among them."""
    failing: set[tuple[Any, ...]] = set()
    found: dict[Fault, None] = {}
    blamed = check.fields.index(check.blamed)
    for combination in product(*(columns[name] for name in check.fields)):
        values = tuple(value for _, value in combination)
        if message := check.message(*values):
            failing.add(values)
            found[Fault(combination[blamed][0], message)] = None
    faults.extend(found)
    return failing


def _normal_layers(value: Any, extents: list[int]) -> int | dict[str, float]:
    if not isinstance(value, PerSite | PerSide):
        return int(value)
    return resolved_layers(value, extents[0]) if len(extents) == 1 else value.model_dump()
