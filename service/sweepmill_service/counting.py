"""How many ensembles a specification would expand to, from the lengths of its axes alone.

Expanding first and counting then would let a line of text ask for a trillion ensembles.
"""

from collections.abc import Mapping, Sequence
from decimal import Decimal
from typing import Any

from sweepmill.errors import Fault

COUNTED = 10**12  # beyond this it is "or more"


def too_many(specification: Mapping[str, Any], limit: int) -> Fault | None:
    """The fault of a specification that expands beyond ``limit``. What is malformed counts as one value."""
    circuit = specification.get("circuit")
    blocks = circuit if isinstance(circuit, Sequence) else [circuit]
    count = min(sum(_combinations(block) for block in blocks if isinstance(block, Mapping)), COUNTED)
    if count <= limit:
        return None
    number = f"{count}" if count < COUNTED else f"{COUNTED} or more"
    return Fault("circuit", f"this server takes at most {limit} ensembles per sweep, the axes multiply to {number}")


def _combinations(block: Mapping[str, Any]) -> int:
    count = 1
    for value in block.values():
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
