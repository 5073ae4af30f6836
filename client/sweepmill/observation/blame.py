"""Which field of a circuit an observation does not fit."""

from sweepmill.ensemble import LAYERED, Ensemble
from sweepmill.observation.base import LATTICE
from sweepmill.observation.engines import CLUSTERS
from sweepmill.observation.entropies import NOT_ANTIPODAL
from sweepmill.observation.outcomes import TWICE
from sweepmill.observation.regions import NOT_DISJOINT, Fault

_OWN = frozenset({NOT_DISJOINT, NOT_ANTIPODAL, TWICE})
"""Faults that an observation has with every circuit."""


def blamed(fault: Fault, quantity: str, ensemble: Ensemble, size: str) -> str | None:
    """Field of the circuit behind a fault; ``size`` names that of its size, None is the observation itself."""
    if fault[1] in _OWN:
        return None
    match fault[0]:
        case "histogram" | "pauli":
            return None
        case "at":
            return "layers"
        case "average_translations":
            return _ends(ensemble)
        case "against":
            return _own("initial_state", ensemble)
        case "quantity":
            return _of_quantity(quantity, ensemble)
    return size


def _ends(ensemble: Ensemble) -> str:
    if ensemble.family == LATTICE:
        return "family"
    return next((name for name in ("boundary", "ends") if name in ensemble.parameters), "family")


def _of_quantity(quantity: str, ensemble: Ensemble) -> str:
    if quantity == "cross-entropy":
        return ensemble.forcing or "engine"
    if quantity == "pauli-expectation" or (quantity == "cluster-order" and ensemble.family == CLUSTERS):
        return "engine"
    if quantity == "reference-entropy":
        return "before" if ensemble.family == LAYERED else _own("references", ensemble)
    return "family"


def _own(name: str, ensemble: Ensemble) -> str:
    return name if name in ensemble.parameters else "family"
