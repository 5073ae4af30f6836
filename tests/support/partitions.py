"""Chains of ZZ and X measurements on set partitions: exact averages, and a simulation in plain Python.

Independent of any engine: a state is a set of disjoint clusters of sites (GHZ states up to signs), written for the
exact averages as a restricted growth string, so that eight sites have 4,140 states (the Bell number).
"""

from collections.abc import Callable, Iterable
from functools import cache

import numpy as np
from numpy.typing import NDArray

Partition = tuple[int, ...]


def bonds_of(sites: int, periodic: bool) -> list[tuple[int, int]]:
    """(0,1), (1,2), ..., and (L-1,0) when periodic."""
    return [(site, (site + 1) % sites) for site in range(sites if periodic else sites - 1)]


def entropy(partition: Partition, region: Iterable[int]) -> int:
    """Clusters with sites inside and outside."""
    inside = set(region)
    return len(
        {c for s, c in enumerate(partition) if s in inside} & {c for s, c in enumerate(partition) if s not in inside}
    )


def canonical(partition: Iterable[int]) -> Partition:
    """Clusters numbered in the order of their first sites."""
    seen: dict[int, int] = {}
    return tuple(seen.setdefault(cluster, len(seen)) for cluster in partition)


def measure_zz(partition: Partition, left: int, right: int) -> tuple[Partition, int]:
    """The partition afterwards, and whether the outcome was random."""
    a, b = partition[left], partition[right]
    return canonical(a if cluster == b else cluster for cluster in partition), int(a != b)


def measure_x(partition: Partition, site: int) -> tuple[Partition, int]:
    """The partition afterwards, and whether the outcome was random."""
    if partition.count(partition[site]) == 1:
        return partition, 0
    return canonical(-1 if s == site else cluster for s, cluster in enumerate(partition)), 1


@cache
def partitions(sites: int) -> tuple[Partition, ...]:
    """All of them."""
    if sites == 0:
        return ((),)
    return tuple((*head, c) for head in partitions(sites - 1) for c in range(max(head, default=-1) + 2))


class PartitionChain:
    """The law of the partition step by step, in double precision."""

    def __init__(self, sites: int, periodic: bool, bond_rate: float) -> None:
        self.rate = bond_rate
        self.states = partitions(sites)
        index = {state: number for number, state in enumerate(self.states)}

        def table(move: Callable[[Partition], tuple[Partition, int]]) -> tuple[NDArray[np.intp], NDArray[np.float64]]:
            moved = [move(state) for state in self.states]
            return np.array([index[state] for state, _ in moved]), np.array([float(random) for _, random in moved])

        pairs = bonds_of(sites, periodic)
        self._zz = [table(lambda state, a=a, b=b: measure_zz(state, a, b)) for a, b in pairs]  # type: ignore[misc]
        self._x = [table(lambda state, s=s: measure_x(state, s)) for s in range(sites)]  # type: ignore[misc]
        self.law = np.zeros(len(self.states))
        self.law[index[tuple(range(sites))]] = 1.0
        self.after_bonds = self.law
        self.randomness = (0.0, 0.0)
        """Random outcomes per measurement in the last step: of ZZ, of X."""

    def advance(self, steps: int = 1) -> None:
        """So many steps."""
        for _ in range(steps):
            zz = self._measure(self._zz, self.rate)
            self.after_bonds = self.law
            self.randomness = zz, self._measure(self._x, 1 - self.rate)

    def _measure(self, tables: list[tuple[NDArray[np.intp], NDArray[np.float64]]], rate: float) -> float:
        random = 0.0
        for image, is_random in tables:
            random += float(self.law @ is_random)
            moved = np.bincount(image, weights=self.law, minlength=len(self.law))
            self.law = (1 - rate) * self.law + rate * moved
        return random / len(tables)

    def mean(self, value: Callable[[Partition], float], after_bonds: bool = False) -> float:
        """Average of a function of the state."""
        law = self.after_bonds if after_bonds else self.law
        return float(law @ np.array([value(state) for state in self.states]))
