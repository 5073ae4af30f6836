"""What the readings of a trajectory cost by default, in core-seconds, to within a small factor."""

import math
from collections.abc import Sequence
from functools import lru_cache
from typing import Any, Final, NamedTuple

from sweepmill.coordinates import places
from sweepmill.ensemble import Ensemble
from sweepmill.times import readings
from sweepmill_service.plan.work import Work
from sweepmill_worker.memory import plan_of, read_layers
from sweepmill_worker.observables.probes import Probes

TERM: Final = 5e-8
"""Seconds to take one integer of a reading into a sum."""
COORDINATE: Final = 3e-7
"""Seconds to take one value of a trajectory into the sums, folds and tally of its coordinate."""
USUAL_RATE: Final = 0.16
RATES: Final = (0.03, 0.6)
"""Measurement rates beyond which readings cost no more, or no less."""


class Road(NamedTuple):
    """Seconds of one way to read off a pure state of 64 sites at the usual rate, and the powers they change with."""

    seconds: float
    sites: float
    rate: float

    def at(self, work: Work) -> float:
        """Seconds for a state of some work: the less is measured, the longer are the rows of the state."""
        rate = min(max(work.rate, RATES[0]), RATES[1]) / USUAL_RATE
        return self.seconds * math.exp(self.sites * math.log(work.sites / 64) + self.rate * math.log(rate))


PREFIXES: Final = Road(2.4e-6, 1.5, -0.4)
"""One elimination for all regions that begin at site 0."""
CLIPPED: Final = Road(7e-6, 1.4, -0.4)
"""The clipped gauge, for all other intervals."""
REGION: Final = Road(3.5e-7, 1.4, -1.3)
"""The commutators of the next region that is no interval."""
INFORMATION: Final = Road(6e-6, 1.4, -0.7)
"""Every site of a region against everything outside."""
FIRST_REGION: Final = Road(3e-6, 1.0, 0.0)
"""Of the first such region, site by site."""
MIXED: Final = 2.0
"""Rows of a mixed state over those of a pure one."""
CLUSTER_SITE: Final = 5e-9
"""Seconds per site to look at every site of a partition, or move an end of an interval past it."""
CLUSTER_REGION: Final = 1e-9
"""The same for the next region that is no interval."""
SIGNED: Final = Road(1e-3, 1.0, 0.0)
SIGNED_REGION: Final = Road(1.5e-4, 0.6, 0.0)
SIGNED_WINDOWS, SIGNED_LENGTHS = 3, 20
"""How many regions per site the means over all intervals cost, and the clipped gauge."""


def signature(observations: Sequence[Any]) -> str:
    """What the same readings share, whatever is read of."""
    return " ".join(sorted({item.key for item in observations}))


def reading_seconds(ensemble: Ensemble, work: Work, observations: Sequence[Any]) -> float:
    """Core-seconds of all readings of a trajectory."""
    if not observations:
        return 0.0
    amount = _amount(_Shape(ensemble), tuple(observations))
    return amount.layers * _state_seconds(work, amount.probes) + TERM * amount.terms + COORDINATE * amount.coordinates


class _Shape:
    """An ensemble that equals all others with the same readings."""

    def __init__(self, ensemble: Ensemble) -> None:
        self.ensemble = ensemble
        self.shape = ensemble.shape

    def __eq__(self, other: object) -> bool:
        return isinstance(other, _Shape) and self.shape == other.shape

    def __hash__(self) -> int:
        return hash(self.shape)


class _Amount(NamedTuple):
    """How much is read of one trajectory."""

    layers: int
    probes: Probes
    terms: int
    coordinates: int


@lru_cache(maxsize=512)
def _amount(shape: _Shape, observations: tuple[Any, ...]) -> _Amount:
    ensemble = shape.ensemble
    plan = plan_of(ensemble, observations)
    times = [readings(item.at, ensemble.layers, ensemble.cell) for item in observations]
    terms = coordinates = 0
    for item, when, indices in zip(observations, times, plan.indices, strict=True):
        coordinates += len(when) * len(places(ensemble, item)) * int(item.COMPONENTS)
        terms += 0 if indices is None else indices.size * sum(len(one.layers) for one in when)
    return _Amount(len(read_layers(times, plan)), plan.probes, terms, coordinates)


def _state_seconds(work: Work, probes: Probes) -> float:
    """Seconds to answer all probes once."""
    clipped = probes.line or probes.ring or probes.lengths or bool((probes.arcs[:, 0] > 0).any())
    if work.kind == "clusters":
        looks = 2 + (len(probes.arcs) > 0) + clipped + len(probes.informations)
        return work.sites * (CLUSTER_SITE * looks + CLUSTER_REGION * len(probes.sets))
    if work.kind == "signed":
        return SIGNED.at(work) + SIGNED_REGION.at(work) * _signed_regions(work, probes)
    basis = CLIPPED.at(work) if clipped else PREFIXES.at(work) if len(probes.arcs) or probes.negativities else 0.0
    regions = len(probes.sets) + (len(probes.negativities) if work.kind == "channels" else 0)
    others = FIRST_REGION.at(work) * (regions > 0) + REGION.at(work) * regions
    factor = MIXED if work.kind == "channels" else 1.0
    return factor * (basis + others) + INFORMATION.at(work) * len(probes.informations)


def _signed_regions(work: Work, probes: Probes) -> int:
    windows = SIGNED_WINDOWS * (probes.line + probes.ring) + SIGNED_LENGTHS * probes.lengths
    return (
        len(probes.arcs) + len(probes.sets) + len(probes.informations) + len(probes.negativities) + work.sites * windows
    )
