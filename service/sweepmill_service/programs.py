"""Refuses circuits that are too long: as written, before they are expanded, and as compiled, before they are."""

from collections.abc import Iterable, Iterator, Mapping
from typing import Any, Final

from sweepmill.ensemble import LAYERED, PROGRAM, Ensemble
from sweepmill.errors import Fault
from sweepmill.language.geometry import number_of_places
from sweepmill_service.counting import blocks, combinations
from sweepmill_service.settings import ServerLimits

WAVE: Final = 200
"""Time to compile a cosine, in places."""


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


def too_many_places(ensembles: Iterable[Ensemble], limits: ServerLimits) -> Fault | None:
    """The fault of a sweep with a circuit whose tables would be too long, preparing layers and profiles included."""
    most = max(map(compiled_places, ensembles))
    if most <= limits.compiled_places:
        return None
    return Fault(
        "circuit",
        f"this server compiles circuits of at most {limits.compiled_places} places, each of its layers counted once, "
        f"got {most}: fewer layers before the repeated ones, shorter lists of layers, or fewer sites",
    )


def compiled_places(ensemble: Ensemble) -> int:
    """Places in the tables of a compiled circuit; a quasi-periodic value by layer counts as 200 in each layer."""
    if ensemble.family == LAYERED:
        steps = [step for part in PROGRAM for layer in ensemble.parameters[part] for step in layer]
        places = sum(number_of_places(step["on"], ensemble.sites, ensemble.periodic) for step in steps)
        return places + WAVE * ensemble.layers * sum(map(_waves, steps))
    scrambling = int(ensemble.parameters.get("scrambling_layers", 0))
    return ensemble.cell * 2 * ensemble.sites + scrambling * ensemble.sites // 2


def _waves(part: Any) -> int:
    """Quasi-periodic profiles by layer in a piece of a circuit: each of their values is a cosine to 50 digits."""
    if isinstance(part, Mapping):
        mine = part.get("profile") == "quasi-periodic" and part.get("by") == "layer"
        return mine + sum(map(_waves, part.values()))
    return sum(map(_waves, part)) if isinstance(part, list | tuple) else 0


def _values(part: Any) -> int:
    if isinstance(part, Mapping):
        return 1 + sum(map(_values, part.values()))
    return 1 + sum(map(_values, part)) if isinstance(part, list | tuple) else 1
