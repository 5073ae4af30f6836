"""Observations: what is read off every trajectory. One model per quantity."""

from collections.abc import Mapping
from typing import Annotated, Any

from pydantic import Field, TypeAdapter

from sweepmill.observation.base import NAME_PATTERN
from sweepmill.observation.crossed import CrossEntropy
from sweepmill.observation.entropies import (
    Entropy,
    GlobalEntropy,
    MutualInformation,
    ReferenceEntropy,
    TripartiteInformation,
)
from sweepmill.observation.outcomes import PAULI_PATTERN, OutcomeRandomness, PauliExpectation, RecordBits
from sweepmill.observation.regions import REGION_TAGS, sites_label
from sweepmill.observation.structure import ClusterOrder, GeneratorLengths, Negativity, SiteEnvironmentInformation
from sweepmill.revisions import QUANTITY_REVISIONS

__all__ = [
    "NAME_PATTERN",
    "PAULI_PATTERN",
    "QUANTITIES",
    "REGION_TAGS",
    "ClusterOrder",
    "CrossEntropy",
    "Entropy",
    "GeneratorLengths",
    "GlobalEntropy",
    "MutualInformation",
    "Negativity",
    "Observation",
    "OutcomeRandomness",
    "PauliExpectation",
    "RecordBits",
    "ReferenceEntropy",
    "SiteEnvironmentInformation",
    "TripartiteInformation",
    "observation_from_normal_form",
    "sites_label",
    "wants_histogram",
]

Observation = Annotated[
    Entropy
    | GlobalEntropy
    | MutualInformation
    | TripartiteInformation
    | ReferenceEntropy
    | SiteEnvironmentInformation
    | Negativity
    | GeneratorLengths
    | ClusterOrder
    | RecordBits
    | OutcomeRandomness
    | PauliExpectation
    | CrossEntropy,
    Field(discriminator="quantity"),
]
QUANTITIES: tuple[str, ...] = tuple(QUANTITY_REVISIONS)
_ADAPTER: TypeAdapter[Any] = TypeAdapter(Observation)


def observation_from_normal_form(form: Mapping[str, Any]) -> Observation:
    """The inverse of ``normal_form``. Raises ValueError for another revision of the quantity."""
    fields = {name: value for name, value in form.items() if name != "revision"}
    current = QUANTITY_REVISIONS.get(str(form.get("quantity")))
    if form.get("revision") != current:
        raise ValueError(f"{form.get('quantity')} has revision {current} here, not {form.get('revision')}")
    observation: Observation = _ADAPTER.validate_python(fields)
    return observation


def wants_histogram(observation: Observation) -> bool:
    """Whether the exact integer histogram of single readings is kept."""
    return bool(getattr(observation, "histogram", False))
