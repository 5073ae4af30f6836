"""Core-seconds of one trajectory: measured where there are batches, scaled from the nearest, else a guess."""

import math
from bisect import bisect_left
from collections.abc import Iterable, Mapping
from typing import NamedTuple

from sweepmill.ensemble import Ensemble
from sweepmill_service.plan.costs import default_seconds_per_trajectory
from sweepmill_service.store import Store


class Cost(NamedTuple):
    """Core-seconds of one trajectory, and whether batches, of this ensemble or another of its family, said so."""

    seconds: float
    measured: bool


class Costs:
    """Costs of some ensembles, by key."""

    def __init__(self, ensembles: Iterable[Ensemble], measured: Mapping[str, float]) -> None:
        by_key = {ensemble.key: ensemble for ensemble in ensembles}
        nearest = Nearest([(by_key[key], seconds) for key, seconds in measured.items()])
        self._costs = {
            key: Cost(measured[key], True) if key in measured else nearest.cost(ensemble)
            for key, ensemble in by_key.items()
        }

    @classmethod
    def of(cls, ensembles: Iterable[Ensemble], store: Store) -> "Costs":
        """Costs from what the store has measured of these ensembles."""
        some = list(ensembles)
        return cls(some, store.seconds_per_trajectory([ensemble.key for ensemble in some]))

    def __getitem__(self, key: str) -> Cost:
        return self._costs[key]


class Nearest:
    """Costs scaled by the guess from the ensemble of the same family that is nearest in the guess."""

    def __init__(self, measured: Iterable[tuple[Ensemble, float]]) -> None:
        self._families: dict[str, list[tuple[float, float]]] = {}
        for ensemble, seconds in measured:
            guess = math.log(default_seconds_per_trajectory(ensemble))
            self._families.setdefault(ensemble.family, []).append((guess, math.log(max(seconds, 1e-9)) - guess))
        for known in self._families.values():
            known.sort()

    def cost(self, ensemble: Ensemble) -> Cost:
        """The guess times what the nearest one took over its guess."""
        guess = math.log(default_seconds_per_trajectory(ensemble))
        known = self._families.get(ensemble.family)
        if not known:
            return Cost(math.exp(guess), False)
        at = bisect_left(known, (guess, 0.0))
        _, excess = min(known[max(at - 1, 0) : at + 1], key=lambda item: abs(item[0] - guess))
        return Cost(math.exp(guess + excess), True)
