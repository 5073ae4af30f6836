"""Probes: what an engine reads off a state, free of how it does it. Every engine answers the same probes."""

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field
from functools import cached_property
from typing import NamedTuple

import numpy as np
from numpy.typing import NDArray

Region = tuple[int, ...]
"""Ascending sites; reference qubit j is site `sites + j`."""


class Information(NamedTuple):
    """I(x : everything outside the region) of all x, summed over the sites of each depth 1, 2, ..."""

    region: Region
    depths: tuple[int, ...]
    """Depth of each site of the region; every depth up to the largest occurs."""


class Pauli(NamedTuple):
    """A product of Pauli letters on distinct sites."""

    letters: str
    sites: Region


class Layout(NamedTuple):
    """Where the integers of each probe stand among those of a reading."""

    regions: slice
    """Entropies in bits: arcs, then sets."""
    line: slice
    ring: slice
    informations: tuple[slice, ...]
    negativities: slice
    lengths: slice
    cluster_order: slice
    paulis: slice
    against: slice


def no_arcs() -> NDArray[np.int64]:
    """An empty list of arcs."""
    return np.zeros((0, 2), dtype=np.int64)


@dataclass(frozen=True, eq=False)
class Probes:
    """What to read off a state of a chain of `sites` sites and `references` reference qubits behind them."""

    sites: int
    references: int = 0
    arcs: NDArray[np.int64] = field(default_factory=no_arcs)
    """[n, 2]: first site and length of regions contiguous on the ring of the chain; their entropies are read."""
    sets: tuple[Region, ...] = ()
    """Other regions whose entropies are read."""
    line: bool = False
    """For each l = 1 .. L, the sum of the entropies of the L - l + 1 intervals of l sites of the open line."""
    ring: bool = False
    """For each l = 1 .. L, the sum over the L intervals of l sites of the ring."""
    informations: tuple[Information, ...] = ()
    negativities: tuple[Region, ...] = ()
    """Regions of the chain, against the rest of the chain."""
    lengths: bool = False
    """For each l = 1 .. L, the number of the chain's stabilizer generators of that length in the clipped gauge."""
    cluster_order: bool = False
    """Sum of the squared cluster sizes (engine of clusters only)."""
    paulis: tuple[Pauli, ...] = ()
    """Expectations (engine with signs only)."""
    against: tuple[str, ...] = ()
    """Initial states: chi of the record so far, or of the circuit so far in units of `CHI_UNIT` without signs."""

    @cached_property
    def layout(self) -> Layout:
        """The integers of a reading, in order."""
        ends = [0]

        def next_slice(size: int) -> slice:
            ends.append(ends[-1] + size)
            return slice(ends[-2], ends[-1])

        return Layout(
            regions=next_slice(len(self.arcs) + len(self.sets)),
            line=next_slice(self.sites * self.line),
            ring=next_slice(self.sites * self.ring),
            informations=tuple(next_slice(max(item.depths)) for item in self.informations),
            negativities=next_slice(len(self.negativities)),
            lengths=next_slice(self.sites * self.lengths),
            cluster_order=next_slice(int(self.cluster_order)),
            paulis=next_slice(len(self.paulis)),
            against=next_slice(len(self.against)),
        )

    @property
    def size(self) -> int:
        """Number of integers of a reading."""
        return int(self.layout.against.stop)

    @property
    def total(self) -> int:
        """Number of sites with the reference qubits."""
        return self.sites + self.references


def arc_of(region: Region, sites: int) -> tuple[int, int] | None:
    """(first site, length) of a region contiguous on the ring of `sites` sites, else None."""
    length = len(region)
    if length == 0:
        return 0, 0
    if region[-1] >= sites:
        return None
    if region[-1] - region[0] == length - 1:
        return region[0], length
    gaps = [i for i in range(1, length) if region[i] != region[i - 1] + 1]
    wraps = len(gaps) == 1 and region[0] == 0 and region[-1] == sites - 1
    return (region[gaps[0]], length) if wraps else None


def of_regions(sites: int, regions: Iterable[Sequence[int]], references: int = 0) -> Probes:
    """Probes of entropies only, arcs among the regions or not, in the order given."""
    return Probes(sites, references, sets=tuple(tuple(region) for region in regions))
