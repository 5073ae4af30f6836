"""Types of the fields of circuit blocks: every scalar one takes a value, a list of values or a range."""

from decimal import Decimal
from typing import Annotated, Any, Literal

from pydantic import AfterValidator, BaseModel, BeforeValidator, ConfigDict, Discriminator, Field, Tag
from pydantic_core import PydanticCustomError

from sweepmill.axes import LARGEST_INTEGER, MOST_PER_SITE, Number, NumberRange, nonempty, shape_tag
from sweepmill.language.refusal import printable


class PerSite(BaseModel):
    """A number of layers proportional to the number of sites."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    per_site: Annotated[Number, Field(gt=0, le=MOST_PER_SITE)]


class PerSide(BaseModel):
    """A number of layers proportional to the longer side of a lattice."""

    model_config = ConfigDict(frozen=True, extra="forbid")

    per_side: Annotated[Number, Field(gt=0, le=MOST_PER_SITE)]


def _plain_integer(value: Any, form: str) -> int:
    if isinstance(value, bool) or not isinstance(value, int | float) or value % 1 or abs(value) >= LARGEST_INTEGER:
        raise PydanticCustomError(
            "layers",
            "must be an integer or {form}, got {value}",
            {"value": repr(value), "form": "{ " + form + " = n }"},
        )
    return int(value)


def _layers(value: Any) -> Any:
    if isinstance(value, PerSite):
        return value
    return PerSite.model_validate(value) if isinstance(value, dict) else _plain_integer(value, "per_site")


def _lattice_layers(value: Any) -> Any:
    if isinstance(value, PerSide):
        return value
    return PerSide.model_validate(value) if isinstance(value, dict) else _plain_integer(value, "per_side")


Layers = Annotated[int | PerSite, BeforeValidator(_layers)]
LatticeLayers = Annotated[int | PerSide, BeforeValidator(_lattice_layers)]
LayersAxis = Annotated[
    Annotated[Layers, Tag("axis-value")]
    | Annotated[tuple[Layers, ...], AfterValidator(nonempty), Tag("axis-list")]
    | Annotated[NumberRange, Tag("axis-range")],
    Discriminator(shape_tag),
]
LatticeLayersAxis = Annotated[
    Annotated[LatticeLayers, Tag("axis-value")]
    | Annotated[tuple[LatticeLayers, ...], AfterValidator(nonempty), Tag("axis-list")]
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
LayeredState = Literal["zeros", "plus", "mixed"]
LayeredStateAxis = Annotated[
    Annotated[LayeredState, Tag("axis-value")]
    | Annotated[tuple[LayeredState, ...], AfterValidator(nonempty), Tag("axis-list")],
    Discriminator(shape_tag),
]
Ends = Literal["open", "product", "ring"]
EndsAxis = Annotated[
    Annotated[Ends, Tag("axis-value")] | Annotated[tuple[Ends, ...], AfterValidator(nonempty), Tag("axis-list")],
    Discriminator(shape_tag),
]
Engine = Literal["auto", "reference"]
EngineAxis = Annotated[
    Annotated[Engine, Tag("axis-value")] | Annotated[tuple[Engine, ...], AfterValidator(nonempty), Tag("axis-list")],
    Discriminator(shape_tag),
]
Title = Annotated[str, Field(min_length=1, max_length=64), AfterValidator(printable)]


def resolved_layers(layers: Any, extent: int) -> int:
    """Layers at this number of sites, or longer side of a lattice. Raises ValueError if they are not an integer."""
    if not isinstance(layers, PerSite | PerSide):
        return int(layers)
    name, factor, what = (
        ("per_site", layers.per_site, "sites") if isinstance(layers, PerSite) else ("per_side", layers.per_side, "")
    )
    exact = Decimal(repr(factor)) * extent
    if exact % 1 or exact < 1:
        where = f"{extent} {what}" if what else f"side {extent}"
        raise ValueError(f"{name} = {factor} gives {exact} layers at {where}: must be an integer")
    return int(exact)
