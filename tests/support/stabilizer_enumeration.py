"""Exact averages of small chains from all their stabilizer groups: a source independent of any simulation.

States are sign-free groups written as reduced bases of integers (bit 2q: X part of site q, bit 2q + 1: Z part).  The
law of a circuit is a Markov chain on them: a gate is the uniform mixture over Sp(4, 2) on its two sites, a measured
site replaces the group by (its part that commutes with Z, and Z).  Four sites have 2,295 pure states.
"""

from collections import defaultdict
from collections.abc import Callable, Iterable
from functools import cache
from itertools import product

Group = tuple[int, ...]
Law = dict[Group, float]


def reduced(vectors: Iterable[int]) -> Group:
    """The reduced row echelon basis, highest bits first."""
    basis: list[int] = []
    for vector in vectors:
        for row in basis:
            vector = min(vector, vector ^ row)
        if vector:
            basis = [min(row, row ^ vector) for row in basis]
            basis.append(vector)
    return tuple(sorted(basis, reverse=True))


def restricted(group: Group, region: Iterable[int]) -> int:
    """Rank of the group's restriction to a region."""
    mask = sum(3 << 2 * site for site in region)
    return len(reduced(row & mask for row in group))


def entropy(group: Group, sites: int, region: tuple[int, ...]) -> int:
    """S(A) = |A| - dim(subgroup supported on A), for pure and mixed states."""
    outside = [site for site in range(sites) if site not in region]
    return len(region) - (len(group) - restricted(group, outside))


def measure(group: Group, site: int) -> tuple[Group, int]:
    """The group after measuring Z of a site, and whether the outcome was random."""
    z, x = 2 << 2 * site, 1 << 2 * site
    anticommuting = [row for row in group if row & x]
    if not anticommuting:
        grown = reduced([*group, z])
        return grown, int(len(grown) > len(group))
    pivot = anticommuting[0]
    kept = [row ^ pivot if row & x else row for row in group if row != pivot]
    return reduced([*kept, z]), 1


def generators(left: int, right: int) -> list[Callable[[int], int]]:
    """Maps of Paulis that generate Sp(4, 2): H and S on either site, and CX (textbook actions)."""

    def hadamard(site: int) -> Callable[[int], int]:
        x, z = 2 * site, 2 * site + 1
        return lambda p: p & ~(3 << x) | (p >> x & 1) << z | (p >> z & 1) << x

    def phase(site: int) -> Callable[[int], int]:
        return lambda p: p ^ (p >> 2 * site & 1) << 2 * site + 1

    def controlled(p: int) -> int:
        return p ^ (p >> 2 * left & 1) << 2 * right ^ (p >> 2 * right + 1 & 1) << 2 * left + 1

    return [hadamard(left), hadamard(right), phase(left), phase(right), controlled]


ORBITS: dict[tuple[int, int], dict[Group, tuple[Group, ...]]] = defaultdict(dict)


def orbit(group: Group, left: int, right: int) -> tuple[Group, ...]:
    """All images under gates on two sites: a uniform gate makes each of them equally likely."""
    known = ORBITS[left, right]
    if group not in known:
        found, pending = {group}, [group]
        while pending:
            state = pending.pop()
            images = {reduced(map(generator, state)) for generator in generators(left, right)}
            pending += images - found
            found |= images
        members = tuple(found)
        known.update(dict.fromkeys(members, members))
    return known[group]


@cache
def measurement_law(group: Group, sites: int, rate: float) -> tuple[tuple[Group, float, int, int], ...]:
    """(group, probability, random outcomes, measurements) over all choices of measured sites."""
    results = []
    for chosen in product((0, 1), repeat=sites):
        state, random = group, 0
        for site in range(sites):
            if chosen[site]:
                state, is_random = measure(state, site)
                random += is_random
        weight = rate ** sum(chosen) * (1 - rate) ** (sites - sum(chosen))
        if weight:
            results.append((state, weight, random, sum(chosen)))
    return tuple(results)


class ExactChain:
    """The law of the state layer by layer."""

    def __init__(self, sites: int, periodic: bool, mixed: bool, rate: float) -> None:
        self.sites, self.periodic, self.rate = sites, periodic, rate
        start: Group = () if mixed else reduced(2 << 2 * site for site in range(sites))
        self.law: Law = {start: 1.0}
        self.layer = 0
        self.random = 0.0
        """Mean number of random outcomes in the last layer."""

    def advance(self) -> None:
        """One layer."""
        for left in range(self.layer % 2, self.sites, 2):
            if self.periodic or left + 1 < self.sites:
                self._gate(left, (left + 1) % self.sites)
        self.layer += 1
        measured: Law = defaultdict(float)
        self.random = 0.0
        for group, weight in self.law.items():
            for after, chance, random, _ in measurement_law(group, self.sites, self.rate):
                measured[after] += weight * chance
                self.random += weight * chance * random
        self.law = measured

    def _gate(self, left: int, right: int) -> None:
        weights: dict[int, float] = defaultdict(float)
        orbits: dict[int, tuple[Group, ...]] = {}
        for group, weight in self.law.items():
            members = orbit(group, left, right)
            orbits[id(members)] = members
            weights[id(members)] += weight
        self.law = {group: weights[number] / len(members) for number, members in orbits.items() for group in members}

    def moments(self, value: Callable[[Group], float]) -> tuple[float, float]:
        """Mean and variance of a function of the state."""
        values = [(value(group), weight) for group, weight in self.law.items()]
        mean = sum(v * weight for v, weight in values)
        return mean, sum((v - mean) ** 2 * weight for v, weight in values)

    def mean(self, region: tuple[int, ...]) -> float:
        """E[S] of a region."""
        return self.moments(lambda group: entropy(group, self.sites, region))[0]

    def randomness(self) -> float:
        """Random outcomes per measurement in the last layer."""
        return self.random / (self.sites * self.rate)
