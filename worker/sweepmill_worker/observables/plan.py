"""Which probes a set of observations needs, and how their integers combine into each."""

from collections.abc import Iterable
from dataclasses import dataclass
from functools import lru_cache
from typing import TypeVar

import numpy as np
from numpy.typing import NDArray

from sweepmill.coordinates import translations
from sweepmill.observation import (
    ClusterOrder,
    CrossEntropy,
    Entropy,
    GeneratorLengths,
    Negativity,
    Observation,
    PauliExpectation,
    SiteEnvironmentInformation,
    wants_histogram,
)
from sweepmill.observation.distances import distances
from sweepmill_worker.observables.collect import Codes, Regions
from sweepmill_worker.observables.probes import Information, Layout, Pauli, Probes, Region
from sweepmill_worker.observables.terms import entropy_terms, named

T = TypeVar("T")


@dataclass(frozen=True)
class ProbePlan:
    """All probes of a task, once each, and how each observation is made of their integers.

    `indices`: [positions, readings, K] integers of an observation, None for one of outcome counts.  One reading is the
    sum of `signs` [K] times its K integers.
    """

    probes: Probes
    indices: tuple[NDArray[np.int64] | None, ...]
    signs: tuple[tuple[int, ...], ...]


@lru_cache(maxsize=64)
def plan_probes(sites: int, references: int, periodic: bool, observations: tuple[Observation, ...]) -> ProbePlan:
    """Collect the probes of several observations on a chain; shared ones are read once."""
    regions = Regions(sites)
    codes: dict[Observation, Codes] = {}
    signs: dict[Observation, tuple[int, ...]] = {}
    for item in observations:
        found = None if windows(item) else entropy_terms(sites, references, item)
        if found is not None:
            rows, signs[item] = found
            codes[item] = regions.codes(rows, translations(sites, item))
    others = [item for item in observations if item not in codes]
    probes = Probes(
        sites,
        references,
        arcs=regions.arcs(),
        sets=regions.sets,
        line="line" in map(windows, others),
        ring="ring" in map(windows, others),
        informations=once(information(sites, periodic, i) for i in others if isinstance(i, SiteEnvironmentInformation)),
        negativities=once(region for i in others if isinstance(i, Negativity) for region in negativities(sites, i)),
        lengths=any(isinstance(item, GeneratorLengths) for item in others),
        cluster_order=any(isinstance(item, ClusterOrder) for item in others),
        paulis=once(Pauli(item.pauli, item.sites) for item in others if isinstance(item, PauliExpectation)),
        against=once(item.against for item in others if isinstance(item, CrossEntropy)),
    )
    indices = (
        regions.indices(codes[item]) if item in codes else place(item, probes, periodic) for item in observations
    )
    return ProbePlan(probes, tuple(indices), tuple(signs.get(item, (1,)) for item in observations))


def windows(observation: Observation) -> str | None:
    """Whether an observation is made of sums over the intervals of the open `line` or the `ring`."""
    if not isinstance(observation, Entropy):
        return None
    if observation.region == "every-interval":
        return "ring" if observation.average_translations else "line"
    averaged = observation.average_translations and not wants_histogram(observation)
    return "ring" if observation.region == "every-cut" and averaged else None


def information(sites: int, periodic: bool, observation: SiteEnvironmentInformation) -> Information:
    """The region of an observation, with the depth of each of its sites."""
    region = tuple(named(sites, observation.region))
    return Information(region, tuple(distances(region, sites, periodic).tolist()))


def negativities(sites: int, observation: Negativity) -> list[Region]:
    """The regions of an observation."""
    if observation.region == "every-cut":
        return [tuple(range(cut)) for cut in range(1, sites)]
    return [tuple(named(sites, observation.region))]


def once(items: Iterable[T]) -> tuple[T, ...]:
    """Each item once, in the order of its first appearance."""
    return tuple(dict.fromkeys(items))


def place(observation: Observation, probes: Probes, periodic: bool) -> NDArray[np.int64] | None:
    """[positions, 1, 1] integers of an observation that is no combination of single entropies."""
    numbers = _numbers(observation, probes, periodic)
    return None if numbers is None else np.array(numbers, dtype=np.int64).reshape(-1, 1, 1)


def _numbers(observation: Observation, probes: Probes, periodic: bool) -> range | list[int] | None:
    layout: Layout = probes.layout
    match observation:
        case Entropy():
            part = span(layout.ring if windows(observation) == "ring" else layout.line)
            return part if observation.region == "every-interval" else part[:-1]
        case SiteEnvironmentInformation():
            item = information(probes.sites, periodic, observation)
            return span(layout.informations[probes.informations.index(item)])
        case Negativity():
            regions = span(layout.negativities)
            known = dict(zip(probes.negativities, regions, strict=True))
            return [known[region] for region in negativities(probes.sites, observation)]
        case GeneratorLengths():
            return span(layout.lengths)
        case ClusterOrder():
            return span(layout.cluster_order)
        case PauliExpectation():
            return [layout.paulis.start + probes.paulis.index(Pauli(observation.pauli, observation.sites))]
        case CrossEntropy():
            return [layout.against.start + probes.against.index(observation.against)]
    return None


def span(part: slice) -> range:
    """The numbers of a slice."""
    return range(part.start, part.stop)
