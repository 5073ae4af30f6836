"""The coordinates of an observation on an ensemble: one row of the table each."""

from math import isqrt
from typing import Any, NamedTuple

from sweepmill.accumulate import folds_for
from sweepmill.counts import VARIED_FROM
from sweepmill.ensemble import Ensemble
from sweepmill.observation import Entropy, RecordBits, wants_histogram
from sweepmill.times import readings


class Coordinate(NamedTuple):
    """``layer`` and ``position`` (None without meaning) and the integer ``scale``: value = raw sum / scale."""

    layer: int | None
    position: int | None
    scale: int


def positions(sites: int, observation: Any) -> tuple[int | None, ...]:
    """Position of each coordinate at one time: the cut x of ``every-cut``, else a single None."""
    if isinstance(observation, Entropy) and observation.region == "every-cut":
        return tuple(range(1, sites))
    return (None,)


def translations(sites: int, observation: Any) -> int:
    """Number of translations averaged over."""
    return sites if getattr(observation, "average_translations", False) else 1


def coordinates(ensemble: Ensemble, observation: Any) -> tuple[Coordinate, ...]:
    """All coordinates, times first: the order of every accumulator."""
    offsets = translations(ensemble.sites, observation)
    places = positions(ensemble.sites, observation)
    times = readings(observation.at, ensemble.layers)
    return tuple(Coordinate(t.layer, place, offsets * len(t.layers)) for t in times for place in places)


def accumulator_bytes(ensemble: Ensemble, observation: Any) -> int:
    """Upper estimate of the size of one total: sums, folds, tally, and the histogram if one is kept."""
    times = len(readings(observation.at, ensemble.layers))
    places = positions(ensemble.sites, observation)
    count = times * len(places)
    components: int = observation.COMPONENTS
    folds = folds_for(count)
    sums = components * (3 + folds) + components * (components + 1) // 2
    tally = VARIED_FROM * (components + 2)  # fewer than 30 trajectories differ, each by a value of its own
    bins = times * sum(_values(ensemble, observation, place) for place in places)
    histogram = bins * (2 + folds) if wants_histogram(observation) else 0
    return 8 * (count * (sums + tally) + histogram + folds) + count + 64


def _values(ensemble: Ensemble, observation: Any, place: int | None) -> int:
    """How many values a single reading takes."""
    if isinstance(observation, RecordBits):
        # a sum of sites x layers outcomes scatters like its square root: six standard deviations to either side
        return 12 * isqrt(ensemble.sites * ensemble.layers) + 1
    if place is not None:
        return min(place, ensemble.sites - place) + 1
    return ensemble.sites + 1
