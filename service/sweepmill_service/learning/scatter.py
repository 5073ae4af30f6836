"""How much trajectories scatter: expected standard errors before an ensemble is sampled, or with few of them.

The scatter of an observation on an ensemble is that of its noisiest coordinate: its standard error times the square
root of the number of trajectories.
"""

import json
import math
from collections.abc import Iterable, Sequence
from typing import Any, Final, Literal, NamedTuple

import numpy as np

from sweepmill.accumulate import Accumulator
from sweepmill.coordinates import coordinates
from sweepmill.ensemble import Ensemble
from sweepmill.observation import observation_from_normal_form
from sweepmill.statistics import summarize
from sweepmill_service.learning.cases import DIMENSIONS, place, variant
from sweepmill_service.learning.neighbors import Cases, Floats, Law, Neighbors
from sweepmill_service.learning.usual import USUAL, usual_scatter
from sweepmill_service.plan.work import work_of
from sweepmill_service.store.evidence import Scattered

LAW: Final = Law(shared=(0.5, 0.4, 0.3), local=0.4, together=1)
"""In logarithms: the quantity, the observation as a whole, the observation on one law of circuits."""
EXCESS: Final = 9.0
"""Kurtosis of what is averaged, from experience: it says how well few trajectories tell their variance."""
SURE: Final = 200
"""Trajectories from which on an ensemble's own scatter is taken as it is."""

Source = Literal["sampled", "learned", "default", "unknown"]


class Scatter(NamedTuple):
    """Scatter of an observation on some ensembles [n], the deviation of its logarithm, and what each rests on."""

    values: Floats
    deviations: Floats
    sources: tuple[Source, ...]


class Measured(NamedTuple):
    """Scatter of one total, and the number of its trajectories."""

    value: float
    trajectories: int

    @property
    def deviation(self) -> float:
        """Standard deviation of the logarithm."""
        return 0.5 * math.sqrt((EXCESS - 1) / self.trajectories)


def measured(total: Scattered) -> Measured | None:
    """The scatter that a total tells; None for a total of which all coordinates are constant or undefined."""
    try:
        observation = observation_from_normal_form(json.loads(total.observation))
    except ValueError:
        return None
    accumulator = Accumulator.from_bytes(total.accumulator)
    places = coordinates(Ensemble.from_normal_form(json.loads(total.ensemble)), observation)
    errors = [one.standard_error for one in summarize(accumulator, places)]
    largest = max((error for error in errors if math.isfinite(error)), default=0.0)
    return Measured(largest * math.sqrt(accumulator.count), accumulator.count) if largest > 0 else None


class ScatterModel:
    """Scatter of one observation, learned from totals of it."""

    def __init__(self, observation: Any, totals: Iterable[Scattered]) -> None:
        self._observation = observation
        self._own: dict[str, Measured] = {}
        cases, residuals = [], []
        for total in totals:
            if (found := measured(total)) is not None:
                self._own[total.ensemble_key] = found
                ensemble = Ensemble.from_normal_form(json.loads(total.ensemble))
                cases.append(ensemble)
                residuals.append((math.log(found.value / self._base(ensemble)), found.deviation**2))
        values = np.array(residuals, dtype=float).reshape(-1, 2)
        self._near = Neighbors(LAW, self._cases(cases), values[:, 0], values[:, 1] + 1e-4)

    def predict(self, ensembles: Sequence[Ensemble]) -> Scatter:
        """The scatter on some ensembles."""
        cases = self._cases(ensembles)
        base = np.array([self._base(ensemble) for ensemble in ensembles])
        values, deviations = base * np.exp(self._near.means(cases)), self._near.deviations(cases)
        sources: list[Source] = [self._source] * len(ensembles)
        for i, ensemble in enumerate(ensembles):
            own = self._own.get(ensemble.key)
            if own is not None:
                sources[i] = "sampled"
                if own.trajectories >= SURE:
                    values[i], deviations[i] = own.value, own.deviation
        return Scatter(values, deviations, tuple(sources))

    @property
    def _source(self) -> Source:
        if self._own:
            return "learned"
        return "default" if self._observation.quantity in USUAL else "unknown"

    def _base(self, ensemble: Ensemble) -> float:
        return usual_scatter(self._observation, ensemble)

    def _cases(self, ensembles: Sequence[Ensemble]) -> Cases:
        item = self._observation
        places = [place(ensemble, work_of(ensemble)) for ensemble in ensembles]
        names = [(item.quantity, item.key, variant(ensemble)) for ensemble in ensembles]
        number = len(ensembles)
        return Cases(
            names, np.ones((number, len(LAW.shared))), np.array(places, dtype=float).reshape(number, DIMENSIONS)
        )
