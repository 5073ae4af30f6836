"""What a goal asks for, as it stands in a specification."""

from typing import Annotated, Any, Literal

from pydantic import AfterValidator, BeforeValidator, Field
from pydantic_core import PydanticCustomError

from sweepmill.axes import Number, NumberRange
from sweepmill.times import Strict, as_tuple

MOST_VALUES = 2000
# Coefficients and exponents of the laws of `sweepmill.analysis`, which the thin client cannot import.
LAWS: dict[str, tuple[str, ...]] = {
    "area": ("a",),
    "logarithm": ("a", "b"),
    "volume": ("s", "b"),
    "volume + logarithm": ("s", "c", "b"),
    "volume + power": ("s", "c", "b", "g"),
    "fractional": ("a", "b", "g"),
}
LawName = Literal["area", "logarithm", "volume", "volume + logarithm", "volume + power", "fractional"]


def _ascending(bounds: tuple[float, float]) -> tuple[float, float]:
    if not bounds[0] < bounds[1]:
        raise PydanticCustomError(
            "bounds",
            "must be two numbers, the smaller first, got {low} and {high}",
            {"low": bounds[0], "high": bounds[1]},
        )
    return bounds


Bounds = Annotated[tuple[Number, Number], BeforeValidator(as_tuple), AfterValidator(_ascending)]


class CriticalPointGoal(Strict):
    """The critical point from the crossing curves of several sizes, its standard error below a bound.

    New values of the axis are placed on the grid ``within[0]``, ``within[0] + step``, … ``within[1]``.
    """

    of: str
    below: Annotated[Number, Field(gt=0)]
    within: Bounds
    step: Annotated[Number, Field(gt=0)]
    axis: str | None = None

    def grid(self) -> tuple[float, ...]:
        """Where new values may be placed. Raises ValueError if the step does not lead from bound to bound."""
        if (self.within[1] - self.within[0]) / self.step > MOST_VALUES:
            raise ValueError(f"at most {MOST_VALUES} steps fit between the bounds: take a larger step")
        return NumberRange.model_validate({"from": self.within[0], "to": self.within[1], "step": self.step}).expand()

    def normal_form(self) -> dict[str, Any]:
        """Plain values."""
        return self.model_dump(mode="json", exclude_none=True)


class LawGoal(Strict):
    """A coefficient (or exponent) of an entanglement law, its standard error below a bound.

    The law is in the size of the chain, or in the position of the cut within one ensemble.
    """

    of: str
    law: LawName
    coefficient: str
    below: Annotated[Number, Field(gt=0)]
    over: Literal["sites", "position"] = "sites"

    def normal_form(self) -> dict[str, Any]:
        """Plain values, the default omitted."""
        return self.model_dump(mode="json", exclude_defaults=True)


Goal = CriticalPointGoal | LawGoal


def kind_of(goal: Goal) -> str:
    """The name under which a goal stands in a specification."""
    return "critical_point" if isinstance(goal, CriticalPointGoal) else "law"
