"""Entropy of a part of a uniformly random pure stabilizer state: where deep circuits without measurements end."""

from dataclasses import dataclass
from typing import Any

import numpy as np

from sweepmill.analysis.arrays import Vector
from sweepmill.ensemble import Ensemble
from sweepmill.observation import Entropy, Negativity


@dataclass(frozen=True, eq=False)
class ExactLaw:
    """Probabilities [H] of values [H], which are all values that can occur."""

    values: Vector
    probabilities: Vector
    name: str

    @property
    def mean(self) -> float:
        """Exact mean."""
        return float(self.values @ self.probabilities)


def random_stabilizer_entropy(inside: int, outside: int) -> ExactLaw:
    """Law of the entropy S in bits of `inside` qubits of a random stabilizer state of `inside` + `outside` qubits.

    Source: Exact entanglement probability distribution of bi-partite randomised stabilizer states, Quantum Information
    and Computation 6, 527 (2006), arXiv:quant-ph/0511119. There are I_A(a - k) I_B(b - k) |Sp(2k, 2)| states with
    S = k, I(m) isotropic subspaces of m dimensions; with the known I(m + 1) / I(m), consecutive numbers differ by the
    factor 2^(a + b + 1 - 2k) (1 - 2^-(a-k+1)) (1 - 2^-(b-k+1)) / (1 - 4^-k). Raises ValueError for negative numbers.
    """
    if inside < 0 or outside < 0:
        raise ValueError(f"a part has no fewer than 0 qubits, got {inside} and {outside}")
    k = np.arange(1, min(inside, outside) + 1, dtype=np.float64)
    factors = np.log2(-np.expm1((k - inside - 1) * np.log(2))) + np.log2(-np.expm1((k - outside - 1) * np.log(2)))
    factors += inside + outside + 1 - 2 * k - np.log2(-np.expm1(-k * np.log(4)))
    numbers = np.concatenate([[0.0], np.cumsum(factors)])
    weights = np.exp2(numbers - numbers.max())
    values = np.arange(len(weights), dtype=np.float64)
    return ExactLaw(values, weights / weights.sum(), f"random stabilizer states, {inside} of {inside + outside} qubits")


def stabilizer_law_of(ensemble: Ensemble, observation: Any, position: int | None = None) -> ExactLaw:
    """The law that the entropy of a region, or its negativity, has in a random stabilizer state of the same size.

    `position` is the cut of `every-cut`. Raises ValueError for other quantities and for chains that are not pure.
    """
    if not isinstance(observation, Entropy | Negativity) or observation.region == "every-interval":
        raise ValueError(f"{observation.quantity} has no such law: it is that of the entropy of one region")
    if ensemble.references or ensemble.initial_state == "mixed":
        raise ValueError("the law is that of pure states, and the chain is entangled with others from the start")
    inside = ensemble.sites // 2 if isinstance(observation.region, str) else len(observation.region)
    if observation.region == "every-cut":
        if position is None:
            raise ValueError("every cut has a law of its own: say which position")
        inside = position
    return random_stabilizer_entropy(inside, ensemble.sites - inside)
