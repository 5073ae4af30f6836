"""Circuit blocks of a specification: one model per family, expanded into ensembles."""

from collections.abc import Iterator
from decimal import Decimal
from itertools import product
from math import prod
from typing import Annotated, Any, ClassVar, Literal

from pydantic import AfterValidator, BaseModel, BeforeValidator, ConfigDict, Discriminator, Field, Tag
from pydantic_core import PydanticCustomError

from sweepmill.axes import (
    LARGEST_INTEGER,
    Integer,
    IntegerAxis,
    Number,
    NumberAxis,
    NumberRange,
    located_values,
    nonempty,
    shape_tag,
)
from sweepmill.ensemble import FAMILY_PARAMETERS, Ensemble
from sweepmill.errors import Fault

MOST_ENSEMBLES = 1_000_000  # a guard against slips of the pen; servers take fewer
SMALLEST_RATE = 1e-6  # the kernel's resolution, 2.3e-10, is 2e-4 of it
Values = list[tuple[str, Any]]


class PerSite(BaseModel):
    """A number of layers proportional to the number of sites."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    per_site: Annotated[Number, Field(gt=0)]


def _layers(value: Any) -> Any:
    if isinstance(value, PerSite):
        return value
    return PerSite.model_validate(value) if isinstance(value, dict) else _plain_integer(value)


def _plain_integer(value: Any) -> int:
    if isinstance(value, bool) or not isinstance(value, int | float) or value % 1 or abs(value) >= LARGEST_INTEGER:
        raise PydanticCustomError(
            "layers", "must be an integer or {form}, got {value}", {"value": repr(value), "form": "{ per_site = n }"}
        )
    return int(value)


Layers = Annotated[int | PerSite, BeforeValidator(_layers)]
LayersAxis = Annotated[
    Annotated[Layers, Tag("axis-value")]
    | Annotated[tuple[Layers, ...], AfterValidator(nonempty), Tag("axis-list")]
    | Annotated[NumberRange, Tag("axis-range")],
    Discriminator(shape_tag),
]
Boundary = Literal["periodic", "open"]
BoundaryAxis = Annotated[
    Annotated[Boundary, Tag("axis-value")]
    | Annotated[tuple[Boundary, ...], AfterValidator(nonempty), Tag("axis-list")],
    Discriminator(shape_tag),
]
ChainState = Literal["zeros", "mixed"]
ChainStateAxis = Annotated[
    Annotated[ChainState, Tag("axis-value")]
    | Annotated[tuple[ChainState, ...], AfterValidator(nonempty), Tag("axis-list")],
    Discriminator(shape_tag),
]


class HybridClifford(BaseModel):
    """Brickwork of independent uniform two-qubit Cliffords on a chain; Z measured at a rate per site and layer."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    FAMILY: ClassVar[str] = "hybrid-clifford"

    family: Literal["hybrid-clifford"]
    sites: IntegerAxis
    measurement_rate: NumberAxis
    boundary: BoundaryAxis = "periodic"
    initial_state: ChainStateAxis = "zeros"
    layers: LayersAxis = PerSite(per_site=4)
    replicate: IntegerAxis = 0
    trajectories: Annotated[Integer, Field(ge=1)] | None = None

    def ensembles(self, path: str, faults: list[Fault]) -> Iterator[tuple[str, Ensemble]]:
        """Every valid ensemble of the block with the path to blame; faults found on the way are appended."""
        columns = {name: self._column(name, f"{path}.{name}", faults) for name in FAMILY_PARAMETERS[self.FAMILY]}
        if (size := prod(map(len, columns.values()))) > MOST_ENSEMBLES:
            faults.append(Fault(path, f"a block has at most {MOST_ENSEMBLES} ensembles, the axes multiply to {size}"))
            return
        _check_rings(columns, faults)
        layers_at = _layers_by_size(columns, faults)
        for site_path, sites in columns["sites"]:
            here = columns | {"sites": [(site_path, sites)], "layers": layers_at[sites]}
            for combination in product(*here.values()):
                parameters = dict(zip(here, (value for _, value in combination), strict=True))
                if not (parameters["boundary"] == "periodic" and sites % 2):
                    yield site_path, Ensemble.of(self.FAMILY, **parameters)

    def _column(self, name: str, path: str, faults: list[Fault]) -> Values:
        """All values of one field; the invalid ones become faults and are left out."""
        try:
            located = located_values(getattr(self, name), path)
        except ValueError as error:
            faults.append(Fault(path, str(error)))
            return []
        kept: dict[Any, str] = {}
        for where, value in located:
            message = _range_fault(name, value)
            if message is None and value in kept:
                message = f"the value {value} stands in this axis already"
            if message is not None:
                faults.append(Fault(where, message))
            else:
                kept[value] = where
        return [(where, value) for value, where in kept.items()]


CircuitBlock = HybridClifford
FAMILIES: tuple[str, ...] = tuple(FAMILY_PARAMETERS)


def _range_fault(name: str, value: Any) -> str | None:
    if name == "sites" and (value % 1 or value < 2):
        return f"a chain has an integer number of sites, at least 2, got {value}"
    if name == "measurement_rate" and not 0 <= value <= 1:
        return f"a rate is a probability between 0 and 1, got {value}"
    if name == "measurement_rate" and 0 < value < SMALLEST_RATE:
        return f"a rate is 0 or at least {SMALLEST_RATE:g} (it is resolved to 2^-32), got {value}"
    if name == "layers" and not isinstance(value, PerSite) and (value % 1 or value < 1):
        return f"must be an integer, at least 1, got {value}"
    if name == "replicate" and (value % 1 or value < 0):
        return f"must be an integer, at least 0, got {value}"
    return None


def _check_rings(columns: dict[str, Values], faults: list[Fault]) -> None:
    if any(boundary == "periodic" for _, boundary in columns["boundary"]):
        for path, sites in columns["sites"]:
            if sites % 2:
                faults.append(Fault(path, f"periodic brickwork needs an even number of sites, got {sites}"))


def _layers_by_size(columns: dict[str, Values], faults: list[Fault]) -> dict[int, Values]:
    """Numbers of layers at each size; a ``per_site`` that gives none becomes a fault."""
    resolved: dict[int, Values] = {}
    for _, sites in columns["sites"]:
        resolved[sites] = []
        for path, layers in columns["layers"]:
            try:
                resolved[sites].append((path, resolved_layers(layers, sites)))
            except ValueError as error:
                faults.append(Fault(path, str(error)))
    return resolved


def resolved_layers(layers: int | PerSite, sites: int) -> int:
    """Layers at this size. Raises ValueError if they are not an integer."""
    if not isinstance(layers, PerSite):
        return int(layers)
    exact = Decimal(repr(layers.per_site)) * sites
    if exact % 1 or exact < 1:
        raise ValueError(f"per_site = {layers.per_site} gives {exact} layers at {sites} sites: must be an integer")
    return int(exact)
