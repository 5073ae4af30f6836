"""Which road answers which probe: the cheapest that is allowed.  All roads give the same integers.

The line is the chain cut open at site 0.  An interval of it is answered by the clipped rows inside; an arc that
contains the cut by the rows inside its complement (see `elimination`), in a pure state as the complement itself.
"""

from collections.abc import Iterable
from enum import Enum
from itertools import pairwise
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.observables.probes import Probes, Region, arc_of

Integers = NDArray[np.int64]


class Road(Enum):
    """Ways to an entropy besides commutators, which are always open and answer any region."""

    PREFIXES = "prefixes"
    """One elimination for every [0, x)."""
    INTERVALS = "intervals"
    """The clipped gauge for every arc."""


class Arcs(NamedTuple):
    """Intervals of the line, those that begin last first, short ones first among those that begin together."""

    firsts: Integers
    beyonds: Integers
    places: Integers
    """Where the answers go."""


class Others(NamedTuple):
    """Any regions, one after the other."""

    ends: Integers
    toggles: Integers
    """Sites to add or remove from one region of the sequence to the next, up to each end."""
    ordinals: Integers
    """Per answer its region in the sequence."""
    places: Integers
    values: NDArray[np.int32]
    """Room for the answers of the sequence."""


class Depths(NamedTuple):
    """Regions for the information between their sites and everything outside."""

    depths: Integers
    """[regions, sites]: depth of each site, 0 outside."""
    places: Integers


class Plan(NamedTuple):
    """What to read off a state, sorted by roads; a place of -1 means not wanted."""

    size: int
    """Number of integers."""
    sites: int
    """Sites of the chain; those of the state behind them are reference qubits."""
    mixed: bool
    """Whether the chain may be mixed: its state's or through reference qubits."""
    cuts: Arcs
    """Intervals that begin at site 0."""
    inside: Arcs
    """Intervals answered by the clipped rows inside."""
    around: Arcs
    """Complements of arcs that contain the cut."""
    others: Others
    line: int
    ring: int
    informations: Depths
    negativities: Others
    lengths: int


def plan(probes: Probes, mixed: bool, allowed: frozenset[Road] = frozenset(Road)) -> Plan:
    """Assign a road to each probe; `mixed`: the state has logical rows.

    Raises ValueError for probes that a group without signs cannot answer.
    """
    if probes.cluster_order or probes.paulis:
        raise ValueError("probes: clusters and expectations are not read off a group without signs")
    mixed = mixed or probes.references > 0
    layout = probes.layout
    arcs, sets = _entropies(probes, mixed)
    clipped = probes.line or probes.ring or probes.lengths
    cuts, inside, around, rest = _roads(arcs, probes.sites, mixed, clipped, allowed)
    sets += [(_listed(first, length, probes.sites), place) for first, length, place in rest.tolist()]
    negativities = numbered(probes.negativities, layout.negativities) if mixed else []
    return Plan(
        size=probes.size,
        sites=probes.sites,
        mixed=mixed,
        cuts=cuts,
        inside=inside,
        around=around,
        others=_others([(region if mixed else _smaller(region, probes.sites), place) for region, place in sets]),
        line=layout.line.start if probes.line else -1,
        ring=layout.ring.start if probes.ring else -1,
        informations=_depths(probes),
        negativities=_others(negativities),
        lengths=layout.lengths.start if probes.lengths else -1,
    )


Placed = list[tuple[Region, int]]


def numbered(regions: Iterable[Region], part: slice) -> Placed:
    """Regions with the places of their answers."""
    return list(zip(regions, range(part.start, part.stop), strict=True))


def _entropies(probes: Probes, mixed: bool) -> tuple[Integers, Placed]:
    """Arcs [n, 3] (first, length, place), and other regions; in a pure state the negativity is an entropy."""
    layout = probes.layout
    places = slice(layout.regions.start + len(probes.arcs), layout.regions.stop)
    regions = numbered(probes.sets, places) + ([] if mixed else numbered(probes.negativities, layout.negativities))
    found = [
        (arc_of(region, probes.sites) or _behind(region, probes.sites), region, place) for region, place in regions
    ]
    arcs = np.array([(*arc, place) for arc, _, place in found if arc is not None], dtype=np.int64).reshape(-1, 3)
    first = np.column_stack([probes.arcs, np.arange(len(probes.arcs))])
    return np.concatenate([first, arcs]), [(region, place) for arc, region, place in found if arc is None]


def _behind(region: Region, sites: int) -> tuple[int, int] | None:
    """(first, length) of reference qubits that stand in a row."""
    in_a_row = region[-1] - region[0] == len(region) - 1
    return (region[0], len(region)) if in_a_row and region[0] >= sites else None


def _roads(
    arcs: Integers, sites: int, mixed: bool, clipped: bool, allowed: frozenset[Road]
) -> tuple[Arcs, Arcs, Arcs, Integers]:
    """Arcs [n, 3] as cuts, intervals inside, complements of arcs around, and the rest for the commutators.

    In a pure state a region and its complement have one entropy, and the more convenient of the two is taken.
    """
    first, length, place = arcs.T
    beyond = first + length
    around = (beyond > sites) & (first < sites)
    turned = around if mixed else around | ((beyond == sites) & (first > 0))
    on_line = np.column_stack([np.where(turned, beyond % sites, first), np.where(turned, first, beyond), place])
    cut = (on_line[:, 0] == 0) & ~(mixed & turned)
    if Road.INTERVALS not in allowed:
        cut &= Road.PREFIXES in allowed
        return _arcs(on_line[cut]), _arcs(on_line[:0]), _arcs(on_line[:0]), arcs[~cut]
    others = ~cut & ~(mixed & turned)
    if clipped or others.any() or Road.PREFIXES not in allowed:  # then cuts come for free
        others, cut = others | cut, cut & False
    return _arcs(on_line[cut]), _arcs(on_line[others]), _arcs(on_line[mixed & turned]), arcs[:0]


def _listed(first: int, length: int, sites: int) -> Region:
    if first >= sites:
        return tuple(range(first, first + length))
    return tuple(sorted((first + i) % sites for i in range(length)))


def _arcs(table: Integers) -> Arcs:
    ordered = table[np.lexsort((table[:, 1], -table[:, 0]))]
    return Arcs(*(np.ascontiguousarray(ordered[:, i]) for i in range(3)))


def _smaller(region: Region, sites: int) -> Region:
    """The smaller of a region and its complement (of two halves, the one with site 0): one entropy, read once."""
    if 2 * len(region) < sites or (2 * len(region) == sites and region[0] == 0):
        return region
    inside = set(region)
    return tuple(site for site in range(sites) if site not in inside)


def _others(placed: Placed) -> Others:
    sequence = {region: ordinal for ordinal, region in enumerate(dict.fromkeys(region for region, _ in placed))}
    ordered: list[Region] = [(), *sequence]
    steps = [sorted(set(a) ^ set(b)) for a, b in pairwise(ordered)]
    return Others(
        ends=np.cumsum([len(step) for step in steps], dtype=np.int64),
        toggles=np.array([site for step in steps for site in step], dtype=np.int64),
        ordinals=np.array([sequence[region] for region, _ in placed], dtype=np.int64),
        places=np.array([place for _, place in placed], dtype=np.int64),
        values=np.zeros(len(sequence), dtype=np.int32),
    )


def _depths(probes: Probes) -> Depths:
    depths = np.zeros((len(probes.informations), probes.total), dtype=np.int64)
    for row, item in zip(depths, probes.informations, strict=True):
        row[list(item.region)] = item.depths
    places = [part.start for part in probes.layout.informations]
    return Depths(depths, np.array(places, dtype=np.int64))
