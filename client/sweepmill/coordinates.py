"""The coordinates of an observation on an ensemble: one row of the table each."""

from typing import Any, NamedTuple

from sweepmill.accumulate import folds_for
from sweepmill.ensemble import Ensemble
from sweepmill.observation import Entropy
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
    """Upper estimate of the size of one total, histograms apart."""
    times = len(readings(observation.at, ensemble.layers))
    count = times * len(positions(ensemble.sites, observation))
    components: int = observation.COMPONENTS
    per_coordinate = components * (3 + folds_for(count)) + components * (components + 1) // 2
    return 8 * count * per_coordinate
