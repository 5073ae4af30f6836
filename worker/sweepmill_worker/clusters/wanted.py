"""What to read off a partition, as the kernel reads it."""

from collections.abc import Sequence
from functools import lru_cache
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.observables.probes import Information, Probes, Region

Integers = NDArray[np.int64]


class Wanted(NamedTuple):
    """Places are positions among the integers of a reading; -1 means not wanted."""

    arcs: Integers
    """[n, 2]: first site and length, answered at the places 0 .. n - 1."""
    sets: "Sets"
    informations: "Depths"
    line: int
    ring: int
    lengths: int
    cluster_order: int


class Sets(NamedTuple):
    """Regions in the order in which they differ least: toggle s + 1 adds site s, -(s + 1) removes it."""

    ends: Integers
    toggles: Integers
    places: Integers


class Depths(NamedTuple):
    """Sites of several regions one after the other, each with the place its information is added to."""

    ends: Integers
    sites: Integers
    places: Integers


@lru_cache(maxsize=16)
def wanted(probes: Probes) -> Wanted:
    """Raises ValueError for probes that clusters without signs cannot answer."""
    if probes.references or probes.paulis:
        raise ValueError("probes: clusters have no reference qubits and no expectations")
    layout = probes.layout
    first = len(probes.arcs)
    places = [*range(first, layout.regions.stop), *range(layout.negativities.start, layout.negativities.stop)]
    return Wanted(
        arcs=np.ascontiguousarray(probes.arcs, dtype=np.int64),
        sets=_sets((*probes.sets, *probes.negativities), places),
        informations=_depths(probes.informations, layout.informations),
        line=layout.line.start if probes.line else -1,
        ring=layout.ring.start if probes.ring else -1,
        lengths=layout.lengths.start if probes.lengths else -1,
        cluster_order=layout.cluster_order.start if probes.cluster_order else -1,
    )


def _sets(regions: Sequence[Region], places: Sequence[int]) -> Sets:
    toggles: list[int] = []
    ends, present = [], set[int]()
    order = sorted(range(len(regions)), key=lambda i: (len(regions[i]), regions[i]))
    for index in order:
        inside = set(regions[index])
        toggles += [site + 1 for site in sorted(inside - present)] + [-site - 1 for site in sorted(present - inside)]
        present = inside
        ends.append(len(toggles))
    return Sets(*(np.array(item, dtype=np.int64) for item in (ends, toggles, [places[index] for index in order])))


def _depths(informations: Sequence[Information], places: Sequence[slice]) -> Depths:
    ends = np.cumsum([len(item.region) for item in informations], dtype=np.int64)
    sites = [site for item in informations for site in item.region]
    to = [part.start + depth - 1 for item, part in zip(informations, places, strict=True) for depth in item.depths]
    return Depths(ends, np.array(sites, dtype=np.int64), np.array(to, dtype=np.int64))
