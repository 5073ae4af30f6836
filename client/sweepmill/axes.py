"""Axes: a scalar circuit field given as one value, a list of values or a range.

Numbers are decimal: a range expands exactly (0.13, 0.14, …), and every number is normalized to twelve significant
digits, the very number the kernel samples with.
"""

from decimal import Context, Decimal
from typing import Annotated, Any

from pydantic import AfterValidator, BaseModel, BeforeValidator, ConfigDict, Discriminator, Field, Tag
from pydantic_core import PydanticCustomError

SIGNIFICANT_DIGITS = 12
LONGEST_RANGE = 100_000
LARGEST_INTEGER = 2**53  # larger ones are not exact in JSON, so they cannot be part of a key
MOST_PER_SITE = 1_000_000  # keeps products with a size exact in decimal arithmetic
_CONTEXT = Context(prec=SIGNIFICANT_DIGITS)


def normal_number(number: float) -> float:
    """``number`` at twelve significant digits; -0 becomes 0. Raises ValueError for a number that is not finite."""
    decimal = Decimal(repr(number)) if isinstance(number, float) else Decimal(number)
    if not decimal.is_finite():
        raise ValueError(f"a number must be finite, got {number}")
    rounded = _CONTEXT.plus(decimal)
    if rounded == rounded.to_integral_value() and abs(rounded) < 2**53:
        return int(rounded)
    return float(rounded)


def _strict_number(value: Any) -> Any:
    if isinstance(value, bool) or not isinstance(value, int | float):
        raise PydanticCustomError("number", "must be a number, got {value}", {"value": repr(value)})
    try:
        return normal_number(value)
    except (ValueError, OverflowError):
        raise PydanticCustomError("number", "must be a finite number, got {value}", {"value": repr(value)}) from None


def _strict_integer(value: Any) -> Any:
    """Integers may be spelled 64 or 64.0 (JSON does not tell them apart), nothing else."""
    if isinstance(value, bool) or not isinstance(value, int | float) or value != value or value % 1:
        raise PydanticCustomError("integer", "must be an integer, got {value}", {"value": repr(value)})
    if abs(value) >= LARGEST_INTEGER:
        raise PydanticCustomError(
            "integer", "must be an integer below 2^53, got one of {digits} digits", {"digits": len(str(int(value)))}
        )
    return int(value)


def _strict_flag(value: Any) -> Any:
    if not isinstance(value, bool):
        raise PydanticCustomError("flag", "must be true or false, got {value}", {"value": repr(value)})
    return value


Flag = Annotated[bool, BeforeValidator(_strict_flag)]
Number = Annotated[float, BeforeValidator(_strict_number)]
Integer = Annotated[int, BeforeValidator(_strict_integer)]


class NumberRange(BaseModel):
    """``{from, to, points}`` or ``{from, to, step}``, both ends included, expanded in decimal arithmetic."""

    model_config = ConfigDict(frozen=True, extra="forbid", strict=True, populate_by_name=True)

    first: Number = Field(alias="from")
    last: Number = Field(alias="to")
    points: Annotated[Integer, Field(ge=1, le=LONGEST_RANGE)] | None = None
    step: Annotated[Number, Field(gt=0)] | None = None

    def expand(self) -> tuple[float, ...]:
        """The values, in order. Raises ValueError for a range that does not say how to run from end to end."""
        first, last = Decimal(str(normal_number(self.first))), Decimal(str(normal_number(self.last)))
        if (self.points is None) == (self.step is None):
            raise ValueError("a range has either 'points' or 'step'")
        if last < first:
            raise ValueError(f"a range runs upwards: from {first} to {last} does not")
        if self.points is not None:
            return self._by_points(first, last, self.points)
        return self._by_step(first, last, Decimal(str(self.step)))

    @staticmethod
    def _by_points(first: Decimal, last: Decimal, points: int) -> tuple[float, ...]:
        if points == 1 and first != last:
            raise ValueError("one point needs 'from' equal to 'to'")
        return tuple(normal_number(float(first + (last - first) * i / max(points - 1, 1))) for i in range(points))

    @staticmethod
    def _by_step(first: Decimal, last: Decimal, step: Decimal) -> tuple[float, ...]:
        if (last - first) / step >= LONGEST_RANGE:
            raise ValueError(f"a range has at most {LONGEST_RANGE} values")
        steps, rest = divmod(last - first, step)
        if rest:
            reached = first + steps * step
            raise ValueError(f"step {step} does not lead from {first} to {last}: it stops at {reached}")
        return tuple(normal_number(float(first + step * i)) for i in range(int(steps) + 1))


def nonempty(values: Any) -> Any:
    """A list with nothing in it is refused (pydantic's own check would also count items refused already)."""
    if not values:
        raise PydanticCustomError("empty", "needs at least one item")
    return values


# The tags appear in pydantic's error locations; `faults.py` drops them by these names.
SHAPE_TAGS = frozenset({"axis-value", "axis-list", "axis-range"})


def shape_tag(value: Any) -> str:
    """How an axis is written: the tag of the union member that parses it."""
    if isinstance(value, list | tuple):
        return "axis-list"
    is_range = isinstance(value, NumberRange) or (isinstance(value, dict) and ("from" in value or "to" in value))
    return "axis-range" if is_range else "axis-value"


NumberAxis = Annotated[
    Annotated[Number, Tag("axis-value")]
    | Annotated[tuple[Number, ...], AfterValidator(nonempty), Tag("axis-list")]
    | Annotated[NumberRange, Tag("axis-range")],
    Discriminator(shape_tag),
]
IntegerAxis = Annotated[
    Annotated[Integer, Tag("axis-value")]
    | Annotated[tuple[Integer, ...], AfterValidator(nonempty), Tag("axis-list")]
    | Annotated[NumberRange, Tag("axis-range")],
    Discriminator(shape_tag),
]


def located_values(axis: Any, path: str) -> list[tuple[str, Any]]:
    """All values of a field in the order written, each with its path (list items carry their index).

    Raises ValueError for a range that cannot be expanded.
    """
    if isinstance(axis, NumberRange):
        return [(path, value) for value in axis.expand()]
    if isinstance(axis, tuple):
        return [(f"{path}[{i}]", value) for i, value in enumerate(axis)]
    return [(path, axis)]
