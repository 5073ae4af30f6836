"""Rates and weights as written: a number, a parameter, a profile in space or time, or quenched disorder."""

from collections.abc import Mapping
from typing import Annotated, Any, Literal

from pydantic import AfterValidator, BaseModel, BeforeValidator, ConfigDict, Discriminator, Field, Tag

from sweepmill.axes import Flag, Integer, Number, nonempty
from sweepmill.language.refusal import keys_of, near, refuse, shown
from sweepmill.language.tags import DISORDERS, NUMBER, PARAMETER, PROFILES


class Part(BaseModel):
    """A piece of the language: frozen, unknown fields refused."""

    model_config = ConfigDict(frozen=True, extra="forbid", populate_by_name=True)


class Parameter(Part):
    """The value of a named parameter, or 1 minus it."""

    parameter: str
    complement: Flag = False


def _value_tag(value: Any) -> str:
    return PARAMETER if isinstance(value, Mapping | BaseModel) else NUMBER


Value = Annotated[
    Annotated[Number, Tag(NUMBER)] | Annotated[Parameter, Tag(PARAMETER)],
    Discriminator(_value_tag),
]
Values = Annotated[tuple[Value, ...], BeforeValidator(lambda v: tuple(v) if isinstance(v, list) else v)]
By = Literal["site", "layer"]


class ListProfile(Part):
    """Values by site or layer, taken in turn; the first belongs to site 0, or to layer 1."""

    profile: Literal["list"]
    by: By
    values: Annotated[Values, AfterValidator(nonempty)]


class Stripe(Part):
    """``inside`` where index % period < width, else ``outside``."""

    profile: Literal["stripe"]
    by: By
    period: Annotated[Integer, Field(ge=1)]
    width: Annotated[Integer, Field(ge=0)]
    inside: Value
    outside: Value


class QuasiPeriodic(Part):
    """mean + amplitude * cos(2 pi (index / wavelength + phase))."""

    profile: Literal["quasi-periodic"]
    by: By
    mean: Value
    amplitude: Value
    wavelength: Value
    phase: Value = 0


class UniformDisorder(Part):
    """Uniform in an interval, drawn once per trajectory and place."""

    disorder: Literal["uniform"]
    first: Value = Field(alias="from")
    last: Value = Field(alias="to")


class TwoValued(Part):
    """The first of two values with probability ``weight``, else the second; drawn once per trajectory and place."""

    disorder: Literal["two-valued"]
    values: Annotated[Values, Field(min_length=2, max_length=2)]
    weight: Value


class PowerLaw(Part):
    """Density proportional to r^exponent on (0, largest], drawn once per trajectory and place."""

    disorder: Literal["power-law"]
    exponent: Value
    largest: Value


Profile = ListProfile | Stripe | QuasiPeriodic
Disorder = UniformDisorder | TwoValued | PowerLaw


def _known_form(value: Any) -> Any:
    """Refuse a table that is neither parameter nor known profile nor known disorder."""
    if not isinstance(value, Mapping):
        return value
    for field, known in (("profile", PROFILES), ("disorder", DISORDERS)):
        if field in value and value[field] not in list(known):
            wanted = value[field]
            refuse(f"unknown {field} {shown(wanted)}{near(str(wanted), known)} ({field}s: {', '.join(known)})")
    if not keys_of(value) & {"parameter", "profile", "disorder"}:
        refuse(f"must be a number or a table with 'parameter', 'profile' or 'disorder', got {shown(value)}")
    return value


def _rate_tag(value: Any) -> str:
    for field, known in (("profile", PROFILES), ("disorder", DISORDERS)):
        if field in keys_of(value):
            word = getattr(value, field) if isinstance(value, BaseModel) else value[field]
            return known[word]
    return _value_tag(value)


Rate = Annotated[
    Annotated[Number, Tag(NUMBER)]
    | Annotated[Parameter, Tag(PARAMETER)]
    | Annotated[ListProfile, Tag(PROFILES["list"])]
    | Annotated[Stripe, Tag(PROFILES["stripe"])]
    | Annotated[QuasiPeriodic, Tag(PROFILES["quasi-periodic"])]
    | Annotated[UniformDisorder, Tag(DISORDERS["uniform"])]
    | Annotated[TwoValued, Tag(DISORDERS["two-valued"])]
    | Annotated[PowerLaw, Tag(DISORDERS["power-law"])],
    Discriminator(_rate_tag),
    BeforeValidator(_known_form),
]
