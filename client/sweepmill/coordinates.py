"""The coordinates of an observation on an ensemble: one row of the table each."""

from collections import Counter
from functools import lru_cache
from math import isqrt
from typing import Any, NamedTuple

from sweepmill.accumulate import folds_for
from sweepmill.counts import VARIED_FROM
from sweepmill.ensemble import Ensemble
from sweepmill.observation import (
    ClusterOrder,
    CrossEntropy,
    Entropy,
    GeneratorLengths,
    Negativity,
    OutcomeRandomness,
    PauliExpectation,
    RecordBits,
    ReferenceEntropy,
    SiteEnvironmentInformation,
    wants_histogram,
)
from sweepmill.observation.crossed import CHI_UNIT
from sweepmill.observation.distances import distances
from sweepmill.times import readings


class Coordinate(NamedTuple):
    """``layer`` and ``position`` (None without meaning) and the integer ``scale``: value = raw sum / scale."""

    layer: int | None
    position: int | None
    scale: int


class Place(NamedTuple):
    """A coordinate at one time: its position, and how many readings it sums (or the unit it counts in)."""

    position: int | None
    readings: int


def places(ensemble: Ensemble, observation: Any) -> tuple[Place, ...]:
    """The coordinates of an observation at one time and in one layer."""
    sites, averaged = ensemble.sites, translations(ensemble.sites, observation)
    match observation:
        case Entropy(region="every-interval"):
            return tuple(Place(n, averaged if averaged > 1 else sites - n + 1) for n in range(1, sites + 1))
        case Entropy(region="every-cut") | Negativity(region="every-cut"):
            return tuple(Place(cut, averaged) for cut in range(1, sites))
        case SiteEnvironmentInformation():
            return _depths(observation.region, sites, ensemble.periodic)
        case GeneratorLengths():
            return tuple(Place(length, 1) for length in range(1, sites + 1))
        case ClusterOrder():
            return (Place(None, sites * sites),)
        case CrossEntropy():
            return (Place(None, 1 if ensemble.signed else CHI_UNIT),)
    return (Place(None, averaged),)


def translations(sites: int, observation: Any) -> int:
    """Number of translations averaged over."""
    return sites if getattr(observation, "average_translations", False) else 1


def coordinates(ensemble: Ensemble, observation: Any) -> tuple[Coordinate, ...]:
    """All coordinates, times first: the order of every accumulator."""
    at_one_time = places(ensemble, observation)
    times = readings(observation.at, ensemble.layers, ensemble.cell)
    return tuple(Coordinate(t.layer, p.position, p.readings * len(t.layers)) for t in times for p in at_one_time)


def accumulator_bytes(ensemble: Ensemble, observation: Any) -> int:
    """Upper estimate of the size of one total: sums, folds, tally, and the histogram if one is kept."""
    times = len(readings(observation.at, ensemble.layers, ensemble.cell))
    at_one_time = places(ensemble, observation)
    count = times * len(at_one_time)
    components: int = observation.COMPONENTS
    folds = folds_for(count)
    sums = components * (3 + folds) + components * (components + 1) // 2
    tally = VARIED_FROM * (components + 2)  # fewer than 30 trajectories differ, each by a value of its own
    bins = times * sum(_values(ensemble, observation, place.position) for place in at_one_time)
    histogram = bins * (2 + folds) if wants_histogram(observation) else 0
    return 8 * (count * (sums + tally) + histogram + folds) + count + 64


def kept_bytes(ensemble: Ensemble, observation: Any) -> int:
    """Bytes that the values of one trajectory take before they are compressed; 0 where they are not kept."""
    if not observation.keep_values:
        return 0
    at_one_time = places(ensemble, observation)
    times = readings(observation.at, ensemble.layers, ensemble.cell)
    most = max(place.readings for place in at_one_time) * max(len(time.layers) for time in times)
    span = _largest(ensemble, observation) * most
    width = next((size for size in (1, 2, 4) if span < 256**size), 8)
    components: int = observation.COMPONENTS
    return len(times) * len(at_one_time) * components * width


@lru_cache(maxsize=256)
def _depths(region: str | tuple[int, ...], sites: int, periodic: bool) -> tuple[Place, ...]:
    """Distances from the boundary of a region, each with its number of sites."""
    listed = tuple(range(sites // 2)) if isinstance(region, str) else region
    counts = Counter(distances(listed, sites, periodic).tolist())
    return tuple(Place(depth, counts[depth]) for depth in sorted(counts))


def _largest(ensemble: Ensemble, observation: Any) -> int:
    """By how much the readings of a coordinate differ at most, in units of its scale."""
    match observation:
        case RecordBits() | OutcomeRandomness():
            return ensemble.sites * ensemble.layers
        case ReferenceEntropy():
            return ensemble.references
        case PauliExpectation():
            return 2
        case ClusterOrder() | CrossEntropy():
            return 1
    return ensemble.sites


def _values(ensemble: Ensemble, observation: Any, position: int | None) -> int:
    """How many values a single reading takes."""
    if isinstance(observation, RecordBits):
        # a sum of sites x layers outcomes scatters like its square root: six standard deviations to either side
        return 12 * isqrt(ensemble.sites * ensemble.layers) + 1
    if isinstance(observation, PauliExpectation):
        return 3
    if isinstance(observation, ReferenceEntropy):
        return ensemble.references + 1
    if position is not None:
        return min(position, ensemble.sites - position) + 1
    return ensemble.sites + 1
