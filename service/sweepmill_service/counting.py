"""How many ensembles a specification would expand to, from the lengths of its axes alone.

Expanding first and counting then would let a line of text ask for a trillion ensembles.
"""

import math
from collections.abc import Mapping, Sequence
from typing import Any

from sweepmill.errors import Fault


def too_many(specification: Mapping[str, Any], limit: int) -> Fault | None:
    """The fault of a specification that expands beyond ``limit``. What is malformed counts as one value."""
    circuit = specification.get("circuit")
    blocks = circuit if isinstance(circuit, Sequence) else [circuit]
    count = sum(_combinations(block) for block in blocks if isinstance(block, Mapping))
    if count <= limit:
        return None
    return Fault("circuit", f"this server takes at most {limit} ensembles per sweep, the axes multiply to {count}")


def _combinations(block: Mapping[str, Any]) -> int:
    return math.prod(max(_length(value), 1) for value in block.values())


def _length(value: Any) -> int:
    if isinstance(value, list | tuple):
        return len(value)
    return _range_length(value) if isinstance(value, Mapping) else 1


def _range_length(value: Mapping[str, Any]) -> int:
    points, step = value.get("points"), value.get("step")
    if isinstance(points, int):
        return points
    numbers = (value.get("from"), value.get("to"), step)
    if not all(isinstance(number, int | float) and math.isfinite(number) for number in numbers) or not step:
        return 1
    first, last, step = map(float, numbers)  # type: ignore[arg-type]
    return int((last - first) / step) + 1 if step > 0 else 1
