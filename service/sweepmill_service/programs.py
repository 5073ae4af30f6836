"""Refuses circuits written as data that are too long, before they are expanded."""

from collections.abc import Iterator, Mapping
from typing import Any

from sweepmill.ensemble import PROGRAM
from sweepmill.errors import Fault
from sweepmill_service.counting import blocks, combinations
from sweepmill_service.settings import ServerLimits


def too_long(specification: Mapping[str, Any], limits: ServerLimits) -> Iterator[Fault]:
    """A fault for every circuit of too many words and numbers, and one if all ensembles together have too many."""
    total = 0
    for path, block in blocks(specification):
        size = sum(_values(block.get(part)) for part in PROGRAM)
        total += size * combinations(block)
        if size > limits.program_values:
            yield Fault(path, f"this server takes circuits of at most {limits.program_values} values, got {size}")
    if total > limits.program_values_total:
        yield Fault(
            "circuit",
            f"this server takes at most {limits.program_values_total} values in the circuits of all ensembles of a "
            f"sweep, got {total}: fewer ensembles or shorter circuits",
        )


def _values(part: Any) -> int:
    if isinstance(part, Mapping):
        return 1 + sum(map(_values, part.values()))
    return 1 + sum(map(_values, part)) if isinstance(part, list | tuple) else 1
