"""A stored specification, expanded without checking it again: it was checked when it was submitted."""

import json
from functools import lru_cache
from typing import Any, NamedTuple

from pydantic import TypeAdapter

from sweepmill.ensemble import Ensemble
from sweepmill.families import CircuitBlock
from sweepmill.goals import CriticalPointGoal, Goal, LawGoal, placed
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
    blocks = placed([_BLOCK.validate_python(block) for block in form["circuit"]], _goal(form["stop"]))
    distinct = {(e.family, *e.parameters.items()): e for block in blocks for _, e in block.ensembles("", [])}
    return StoredSweep(tuple(distinct.values()), tuple(_named(item) for item in form["observe"]))


def stored_goal(specification: str) -> Goal:
    """The goal of a sweep's canonical JSON. Raises ValueError where it has none."""
    goal = _goal(json.loads(specification)["stop"])
    if goal is None:
        raise ValueError("this sweep has no goal")
    return goal


def _goal(stop: dict[str, Any]) -> Goal | None:
    if "critical_point" in stop:
        return CriticalPointGoal.model_validate(stop["critical_point"])
    return LawGoal.model_validate(stop["law"]) if "law" in stop else None


def _named(form: dict[str, Any]) -> NamedObservation:
    observation = _OBSERVATION.validate_python({field: value for field, value in form.items() if field != "name"})
    return NamedObservation(form.get("name", form["quantity"]), observation)
