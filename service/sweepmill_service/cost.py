"""Core-seconds of trajectories of some ensembles: the default, corrected by what batches of like ones took."""

from collections.abc import Iterable, Mapping, Sequence
from typing import Any, Literal, NamedTuple

import numpy as np

from sweepmill.ensemble import Ensemble
from sweepmill_service.learning.costs import CostModel, Load, learned, load_of
from sweepmill_service.store import Store
from sweepmill_service.store.evidence import Timed

OWN_BATCHES = 200  # ensembles whose own batches are looked at: of more, some spread over all

Origin = Literal["measured", "learned", "default"]


class Cost(NamedTuple):
    """Core-seconds of one trajectory, the standard deviation of their logarithm, and what they rest on.

    "measured": batches of this ensemble; "learned": batches of ensembles with the same kind of work.
    """

    seconds: float
    deviation: float
    origin: Origin


class Costs:
    """Costs of some ensembles, by key, all with the same observations."""

    def __init__(
        self,
        ensembles: Iterable[Ensemble],
        observations: Sequence[Any],
        batches: Iterable[Timed] = (),
        measured: Iterable[str] = (),
    ) -> None:
        by_key = {ensemble.key: ensemble for ensemble in ensembles}
        self._loads = {key: load_of(ensemble, observations) for key, ensemble in by_key.items()}
        loads, own = list(self._loads.values()), frozenset(measured)
        self._model = learned(batches, loads)
        seconds, deviations = self._model.predict(loads)
        self._costs = {
            key: Cost(float(seconds[i]), float(deviations[i]), _origin(self._model, self._loads[key], key in own))
            for i, key in enumerate(by_key)
        }

    @classmethod
    def of(cls, ensembles: Iterable[Ensemble], observations: Sequence[Any], store: Store) -> "Costs":
        """Costs from what the store has measured."""
        some = list(ensembles)
        measured = list(store.seconds_per_trajectory([ensemble.key for ensemble in some]))
        step = max(1, len(measured) // OWN_BATCHES)
        batches = [*store.batches_of(measured[::step]), *store.recent_batches()]
        return cls(some, observations, batches, measured)

    def __getitem__(self, key: str) -> Cost:
        return self._costs[key]

    def deviation_of_sum(self, seconds: Mapping[str, float]) -> float:
        """Standard deviation of the logarithm of a sum of core-seconds, given by key."""
        loads = [self._loads[key] for key in seconds]
        return self._model.deviation_of_sum(loads, np.array(list(seconds.values()), dtype=float))


def _origin(model: CostModel, load: Load, own: bool) -> Origin:
    if own:
        return "measured"
    return "learned" if load.names[1] in model.kinds else "default"
