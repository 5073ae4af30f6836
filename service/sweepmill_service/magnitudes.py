"""Refuses numbers that are too large before anything is expanded to that size."""

from collections.abc import Iterator, Mapping
from typing import Any

from sweepmill.errors import Fault
from sweepmill.limits import CLUSTERS
from sweepmill_service.counting import blocks
from sweepmill_service.settings import ServerLimits

SAFE_INTEGER = 2**53  # larger ones are not exact in JSON, so that they cannot be part of a key
LONGEST_LOG_SERIES = 1000
LARGEST_RANGE = 100_000


def too_large(specification: Mapping[str, Any], limits: ServerLimits) -> list[Fault]:
    """A fault for every number beyond what this server takes in a field of that name."""
    by_field = {
        "layers": limits.layers,
        "scrambling_layers": limits.layers,
        "per_site": limits.layers,
        "per_side": limits.layers,
        "every": limits.layers,
        "log_spaced": LONGEST_LOG_SERIES,
        "points": LARGEST_RANGE,
    }
    rest = {name: value for name, value in specification.items() if name != "circuit"}
    faults = list(_beyond(rest, "", SAFE_INTEGER, by_field))
    for path, block in blocks(specification):
        sites = limits.cluster_sites if block.get("family") == CLUSTERS else limits.sites
        sizes = dict.fromkeys(("sites", "width", "height", "references"), sites)
        for name, value in block.items():
            limit = (sizes | by_field).get(name, SAFE_INTEGER)
            faults += _beyond(value, f"{path}.{name}", limit, by_field)
    return faults


def _beyond(value: Any, path: str, limit: int, by_field: Mapping[str, int]) -> Iterator[Fault]:
    if isinstance(value, Mapping):
        for name, inner in value.items():
            where = f"{path}.{name}" if path else str(name)
            yield from _beyond(inner, where, by_field.get(name, limit), by_field)
    elif isinstance(value, list):
        for index, inner in enumerate(value):
            yield from _beyond(inner, f"{path}[{index}]", limit, by_field)
    elif isinstance(value, int | float) and not abs(value) <= limit:
        yield Fault(path, f"this server takes numbers up to {limit} here, got {_short(value)}")


def _short(number: float) -> str:
    text = str(number)
    return text if len(text) <= 24 else f"one of {len(text)} digits"
