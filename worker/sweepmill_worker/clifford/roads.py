"""Which road answers which region: the cheapest that is allowed.  All roads give the same entropies."""

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
    return Plan(*(np.ascontiguousarray(table[:, i]) for i in range(3)), ends, toggles)


def _entry(
    sites: int, mixed: bool, region: Region, ordinals: dict[Region, int], allowed: frozenset[Road]
) -> tuple[int, int, int]:
    choices = [region] if mixed else [region, _complement(sites, region)]
    for choice in choices:
        if Road.PREFIXES in allowed and choice == tuple(range(len(choice))):
            return PREFIX, len(choice), len(choice)
    if Road.INTERVALS in allowed:
        for choice in choices:
            if _is_interval(choice):
                return INTERVAL, choice[0], len(choice)
        turned = _turned(sites, region)
        if _is_interval(turned):
            return TURNED, turned[0], len(turned)
    return GENERAL, ordinals.setdefault(min(choices, key=lambda choice: (len(choice), choice)), len(ordinals)), 0


def _is_interval(region: Region) -> bool:
    return len(region) > 0 and region[-1] - region[0] == len(region) - 1


def _turned(sites: int, region: Region) -> Region:
    return tuple(sorted((site - sites // 2) % sites for site in region))


def _complement(sites: int, region: Region) -> Region:
    inside = set(region)
    return tuple(site for site in range(sites) if site not in inside)


def _toggles(sequence: list[Region]) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    steps = [sorted(set(a) ^ set(b)) for a, b in zip([(), *sequence], sequence, strict=False)]
    ends = np.cumsum([len(step) for step in steps], dtype=np.int64)
    return ends, np.array([site for step in steps for site in step], dtype=np.int64)
