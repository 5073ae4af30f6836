"""A stored specification, expanded without checking it again: it was checked when it was submitted."""

import json
from collections.abc import Iterator
from functools import lru_cache
from typing import Any, NamedTuple

from pydantic import TypeAdapter

from sweepmill.ensemble import Ensemble
from sweepmill.families import CircuitBlock
from sweepmill.observation import Observation
from sweepmill.sweep import NamedObservation

_BLOCK: TypeAdapter[Any] = TypeAdapter(CircuitBlock)
_OBSERVATION: TypeAdapter[Any] = TypeAdapter(Observation)


class StoredSweep(NamedTuple):
    """Ensembles by ordinal, and observations by name: in the order of the table."""

    ensembles: tuple[Ensemble, ...]
    observations: tuple[NamedObservation, ...]


@lru_cache(maxsize=4)  # a sweep that is looked at is looked at often, and 20,000 ensembles take 20 MB
def expand(specification: str) -> StoredSweep:
    """Expand a sweep's canonical JSON. Ensembles are told apart by parameters, which is what their keys hash."""
    form = json.loads(specification)
    distinct = {(e.family, *e.parameters.items()): e for e in _ensembles(form["circuit"])}
    return StoredSweep(tuple(distinct.values()), tuple(_named(item) for item in form["observe"]))


def _ensembles(blocks: list[dict[str, Any]]) -> Iterator[Ensemble]:
    for block in blocks:
        for _, ensemble in _BLOCK.validate_python(block).ensembles("", []):
            yield ensemble


def _named(form: dict[str, Any]) -> NamedObservation:
    observation = _OBSERVATION.validate_python({field: value for field, value in form.items() if field != "name"})
    return NamedObservation(form.get("name", form["quantity"]), observation)
