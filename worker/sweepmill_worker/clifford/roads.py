"""Which road answers which region: the cheapest that is allowed.  All roads give the same entropies."""

from bisect import bisect_right
from collections.abc import Sequence
from enum import Enum
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import NDArray

Region = tuple[int, ...]


class Road(Enum):
    """Ways to an entropy besides commutators, which are always open and answer any region."""

    PREFIXES = "prefixes"
    """One elimination for every [0, x)."""
    INTERVALS = "intervals"
    """The clipped gauge for every interval that does not wrap around its origin, 0 or L / 2."""


PREFIX: Final = 0
INTERVAL: Final = 1
TURNED: Final = 2
"""An interval of the chain cut open at L / 2."""
GENERAL: Final = 3


class Plan(NamedTuple):
    """Per region its kind and two numbers; and the sequence of regions of the commutator road."""

    kinds: NDArray[np.int64]
    firsts: NDArray[np.int64]
    """Prefix: its length.  Interval: its first position.  General: its ordinal in the sequence."""
    lengths: NDArray[np.int64]
    toggle_ends: NDArray[np.int64]
    toggles: NDArray[np.int64]
    """Sites to add or remove from one region of the sequence to the next, up to each end."""
    entropies: NDArray[np.int32]
    """Room for the entropies of the sequence."""


def plan(sites: int, mixed: bool, regions: Sequence[Region], allowed: frozenset[Road] = frozenset(Road)) -> Plan:
    """Assign a road to each region.  Regions are sorted tuples of distinct sites.

    In a pure state a region and its complement have one entropy, and the more convenient of the two is taken.
    """
    ordinals: dict[Region, int] = {}
    intervals = Road.INTERVALS in allowed
    entries = [_entry(sites, mixed, region, ordinals, allowed) for region in regions]
    if intervals and any(kind == INTERVAL for kind, _, _ in entries):  # then prefixes come for free
        entries = [(INTERVAL, 0, first) if kind == PREFIX else (kind, first, n) for kind, first, n in entries]
    table = np.array(entries, dtype=np.int64).reshape(-1, 3)
    ends, toggles = _toggles(list(ordinals))
    kinds, firsts, lengths = (np.ascontiguousarray(table[:, i]) for i in range(3))
    return Plan(kinds, firsts, lengths, ends, toggles, np.zeros(len(ends), dtype=np.int32))


def _entry(
    sites: int, mixed: bool, region: Region, ordinals: dict[Region, int], allowed: frozenset[Road]
) -> tuple[int, int, int]:
    arc = _arc(sites, region)
    if arc is None or not allowed:
        return GENERAL, ordinals.setdefault(_canonical(sites, mixed, region), len(ordinals)), 0
    first, length = arc
    arcs = [arc] if mixed else [arc, ((first + length) % sites, sites - length)]
    if Road.PREFIXES in allowed:
        for first, length in arcs:
            if first == 0 or length in (0, sites):
                return PREFIX, length, length
    if Road.INTERVALS in allowed:
        for kind, origin in ((INTERVAL, 0), (TURNED, sites // 2)):
            for first, length in arcs:
                position = (first - origin) % sites
                if position + length <= sites:
                    return kind, position, length
    return GENERAL, ordinals.setdefault(_canonical(sites, mixed, region), len(ordinals)), 0


def _arc(sites: int, region: Region) -> tuple[int, int] | None:
    """(first site, length) of a region contiguous on the ring, else None."""
    length = len(region)
    if length == 0 or region[-1] - region[0] == length - 1:
        return (region[0] if region else 0), length
    run = bisect_right(range(length), 0, key=lambda i: region[i] - i)  # the sites 0 .. run - 1 come first
    if region[-1] == sites - 1 and region[-1] - region[run] == length - run - 1:
        return region[run], length
    return None


def _canonical(sites: int, mixed: bool, region: Region) -> Region:
    """In a pure state the smaller of a region and its complement (of two halves, the one with site 0)."""
    if mixed or 2 * len(region) < sites or (2 * len(region) == sites and region[0] == 0):
        return region
    inside = set(region)
    return tuple(site for site in range(sites) if site not in inside)


def _toggles(sequence: list[Region]) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    steps = [sorted(set(a) ^ set(b)) for a, b in zip([(), *sequence], sequence, strict=False)]
    ends = np.cumsum([len(step) for step in steps], dtype=np.int64)
    return ends, np.array([site for step in steps for site in step], dtype=np.int64)
