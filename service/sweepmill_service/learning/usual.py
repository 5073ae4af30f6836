"""Rough scatter of each quantity, to within a factor of about two, for when nothing like it was sampled.

Measured at the noisiest coordinate on brickwork, lattices, random pairs and clusters of 16 to 256 sites.
"""

import math
from collections.abc import Callable, Mapping
from typing import Any, Final

from sweepmill.ensemble import Ensemble
from sweepmill.times import readings
from sweepmill_service.plan.work import work_of

CRITICAL: Final = 0.16
"""Measurement rate beyond which entropies hardly scatter."""
LEAST_RATE: Final = 0.02
CONSTANT: Final = 0.05
"""Of what hardly varies: the bound that stands in for an error falls with the number of trajectories."""


def _excess(ensemble: Ensemble) -> float:
    """Rate over the critical one; circuits without measurements count as critical."""
    rate = work_of(ensemble).rate
    if ensemble.family == "projective-ising" or rate == 0:
        return 1.0
    return max(rate, LEAST_RATE) / CRITICAL


def _entropy(ensemble: Ensemble, _: Any) -> float:
    above = max(_excess(ensemble), 1.0)
    return 1.5 * float((ensemble.sites / 64) ** (0.3 / above**2) / above**1.3)


def _global_entropy(ensemble: Ensemble, _: Any) -> float:
    mixed = ensemble.parameters.get("initial_state") == "mixed" or "measurement_rate" not in ensemble.parameters
    return 1.3 * math.sqrt(ensemble.sites / 64) if mixed and _excess(ensemble) <= 1.5 else CONSTANT


def _tripartite(ensemble: Ensemble, _: Any) -> float:
    return min(0.65 / _excess(ensemble), 3.0)


def _outcomes(ensemble: Ensemble, observation: Any) -> float:
    layers = ensemble.layers if observation.cumulative else _averaged(ensemble, observation)
    return 0.6 / math.sqrt(ensemble.sites * layers)


def _record(ensemble: Ensemble, _: Any) -> float:
    work = work_of(ensemble)
    return max(0.8 * math.sqrt(work.rate * ensemble.sites * ensemble.layers), CONSTANT)


def _averaged(ensemble: Ensemble, observation: Any) -> int:
    """Layers that a reading averages."""
    return max(len(one.layers) for one in readings(observation.at, ensemble.layers, ensemble.cell))


USUAL: Final[Mapping[str, Callable[[Ensemble, Any], float]]] = {
    "entropy": _entropy,
    "negativity": _entropy,
    "global-entropy": _global_entropy,
    "mutual-information": lambda _, __: 0.2,
    "tripartite-information": _tripartite,
    "reference-entropy": lambda _, __: 0.4,
    "site-environment-information": lambda _, __: 0.45,
    "generator-lengths": lambda ensemble, _: 0.5 * math.sqrt(ensemble.sites),
    "cluster-order": lambda _, __: 0.15,
    "record-bits": _record,
    "outcome-randomness": _outcomes,
    "pauli-expectation": lambda _, __: 0.7,
}
SUMMED: Final = ("record-bits", "outcome-randomness")
"""What does not scatter less where it is averaged over layers, or says so itself."""


def usual_scatter(observation: Any, ensemble: Ensemble) -> float:
    """Scatter of the noisiest coordinate; 1 for a quantity that is not known."""
    quantity = USUAL.get(observation.quantity)
    if quantity is None:
        return 1.0
    fewer = 1.0 if observation.quantity in SUMMED else (2 / max(_averaged(ensemble, observation), 2)) ** 0.25
    return quantity(ensemble, observation) * float(fewer)
