"""How many ensembles a specification would expand to, from the lengths of its axes alone.

Expanding first and counting then would let a line of text ask for a trillion ensembles.
"""

from collections.abc import Mapping
from decimal import Decimal
from typing import Any

from sweepmill.ensemble import PROGRAM
from sweepmill.errors import Fault

COUNTED = 10**12  # beyond this it is "or more"


def too_many(specification: Mapping[str, Any], limit: int) -> Fault | None:
    """The fault of a specification that expands beyond ``limit``. What is malformed counts as one value."""
    count = min(sum(combinations(block) for _, block in blocks(specification)), COUNTED)
    if count <= limit:
        return None
    number = f"{count}" if count < COUNTED else f"{COUNTED} or more"
    return Fault("circuit", f"this server takes at most {limit} ensembles per sweep, the axes multiply to {number}")


def blocks(specification: Mapping[str, Any]) -> list[tuple[str, Mapping[str, Any]]]:
    """The circuit blocks with their paths."""
    circuit = specification.get("circuit")
    if isinstance(circuit, Mapping):
        return [("circuit", circuit)]
    some = circuit if isinstance(circuit, list | tuple) else []
    return [(f"circuit[{index}]", block) for index, block in enumerate(some) if isinstance(block, Mapping)]


def combinations(block: Mapping[str, Any]) -> int:
    """How many ensembles the axes of one block multiply to, counted up to a trillion."""
    parameters = block.get("parameters")
    named = parameters.values() if isinstance(parameters, Mapping) else ()
    fields = (value for name, value in block.items() if name not in (*PROGRAM, "parameters"))
    count = 1
    for value in (*fields, *named):
        count = min(count * max(_length(value), 1), COUNTED)
    return count


def _length(value: Any) -> int:
    if isinstance(value, list | tuple):
        return len(value)
    return _range_length(value) if isinstance(value, Mapping) else 1


def _range_length(value: Mapping[str, Any]) -> int:
    points = value.get("points")
    if isinstance(points, int):
        return points
    first, last, step = (_decimal(value.get(name)) for name in ("from", "to", "step"))
    if first is None or last is None or not step:
        return 1
    return int(min((last - first) / step, Decimal(COUNTED))) + 1


def _decimal(number: Any) -> Decimal | None:
    if isinstance(number, bool) or not isinstance(number, int | float):
        return None
    exact = Decimal(repr(number)) if isinstance(number, float) else Decimal(number)
    return exact if exact.is_finite() else None
