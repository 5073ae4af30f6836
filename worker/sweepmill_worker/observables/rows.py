"""All probes from the rows of a stabilizer group, by plain linear algebra over GF(2): slow, and easy to check.

S(A) = |A| - number of independent group elements inside A: Entanglement in the stabilizer formalism, quant-ph/0406168
(from memory).  Everything else is made of groups inside regions, too.
"""

from collections.abc import Iterable, Sequence

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.observables.probes import Information, Probes, Region

Bits = NDArray[np.uint8]


def read_rows(
    x: Bits, z: Bits, probes: Probes, expectations: Sequence[int] = (), agreements: Sequence[int] = ()
) -> NDArray[np.int32]:
    """The integers of `probes.layout`.

    x, z: [rows, total sites], the X and Z parts of generators, independent or not, of the stabilizer group of a pure
    or mixed state.  `expectations`: what signs say of `probes.paulis`, in order;
    `agreements`: what the record says of `probes.against`.  Raises ValueError for clusters, which a stabilizer group
    does not have.
    """
    if probes.cluster_order:
        raise ValueError("cluster_order: clusters are not read off a stabilizer group")
    group, layout = Group(x, z), probes.layout
    out = np.zeros(probes.size, dtype=np.int32)
    arcs = [ring_interval(first, length, probes.sites) for first, length in probes.arcs.tolist()]
    out[layout.regions] = [group.entropy(region) for region in (*arcs, *probes.sets)]
    if probes.line:
        out[layout.line] = line_sums(group, probes.sites)
    if probes.ring:
        out[layout.ring] = ring_sums(group, probes.sites)
    for part, item in zip(layout.informations, probes.informations, strict=True):
        out[part] = information_sums(group, item)
    if probes.negativities or probes.lengths:
        chain = group.inside(range(probes.sites))
        out[layout.negativities] = [chain.negativity(region) for region in probes.negativities]
        if probes.lengths:
            out[layout.lengths] = generator_lengths(chain, probes.sites)
    out[layout.paulis] = expectations
    out[layout.against] = agreements
    return out


class Group:
    """A group of Pauli products modulo signs, by independent rows [rows, sites, 2] of X and Z bits."""

    def __init__(self, x: Bits, z: Bits) -> None:
        rows = np.stack([x, z], axis=-1).astype(np.uint8)
        self.rows = eliminate(rows, range(rows.shape[1]))[0]
        self.columns = [
            [int.from_bytes(np.packbits(part).tobytes()) for part in site.T] for site in self.rows.swapaxes(0, 1)
        ]

    def inside(self, region: Iterable[int]) -> "Group":
        """The elements that are the identity outside the region."""
        kept = set(region)
        outside = [site for site in range(self.rows.shape[1]) if site not in kept]
        rows = eliminate(self.rows, outside)[1]
        return Group(rows[..., 0], rows[..., 1])

    def entropy(self, region: Iterable[int]) -> int:
        """Entropy of a region in bits: its size minus the number of independent elements inside it.

        Those are all rows less their rank outside.
        """
        kept = set(region)
        outside = (column for site, pair in enumerate(self.columns) if site not in kept for column in pair)
        return len(kept) - len(self.rows) + rank(outside)

    def negativity(self, region: Iterable[int]) -> int:
        """Between a region and the rest: half the rank of the commutators of the rows cut down to the region.

        Entanglement negativity and stabilizer states (from memory).
        """
        x, z = np.moveaxis(self.rows[:, list(region)].astype(np.int64), 2, 0)
        commutators = (x @ z.T + z @ x.T) % 2
        return len(eliminate(commutators.astype(np.uint8)[:, :, None], range(len(x)))[0]) // 2


def rank(vectors: Iterable[int]) -> int:
    """Rank over GF(2) of vectors written as integers."""
    basis: dict[int, int] = {}
    for vector in vectors:
        while vector and vector.bit_length() in basis:
            vector ^= basis[vector.bit_length()]
        if vector:
            basis[vector.bit_length()] = vector
    return len(basis)


def eliminate(rows: Bits, sites: Iterable[int]) -> tuple[Bits, Bits]:
    """Rows [rows, sites, parts] in echelon form on some sites, and the rest, which vanishes there."""
    rows, rank = rows.copy(), 0
    for site in sites:
        for part in range(rows.shape[2]):
            (having,) = np.nonzero(rows[rank:, site, part])
            if not len(having):
                continue
            rows[[rank, rank + having[0]]] = rows[[rank + having[0], rank]]
            rows[rank + having[1:]] ^= rows[rank]
            rank += 1
    return rows[:rank], rows[rank:]


def ring_interval(first: int, length: int, sites: int) -> Region:
    """`length` sites of the ring from the first on."""
    return tuple((first + i) % sites for i in range(length))


def line_sums(group: Group, sites: int) -> list[int]:
    """For each length the sum of the entropies of the intervals of the open line."""
    return [
        sum(group.entropy(range(first, first + length)) for first in range(sites - length + 1))
        for length in range(1, sites + 1)
    ]


def ring_sums(group: Group, sites: int) -> list[int]:
    """For each length the sum of the entropies of the intervals of the ring."""
    return [
        sum(group.entropy(ring_interval(first, length, sites)) for first in range(sites))
        for length in range(1, sites + 1)
    ]


def information_sums(group: Group, item: Information) -> NDArray[np.int64]:
    """For each depth the sum of S_x + S_A - S_(A without x) over the sites x of A at that depth."""
    sums = np.zeros(max(item.depths), dtype=np.int64)
    whole = group.entropy(item.region)
    for site, depth in zip(item.region, item.depths, strict=True):
        rest = group.entropy(other for other in item.region if other != site)
        sums[depth - 1] += group.entropy([site]) + whole - rest
    return sums


def generator_lengths(chain: Group, sites: int) -> NDArray[np.int64]:
    """For each length the number of generators in the clipped gauge, without making it.

    As many of its rows lie inside an interval as the group has independent elements there: so many begin at one site
    and end at another as a second difference of the group's ranks says.
    """
    inside = np.zeros((sites + 1, sites + 1), dtype=np.int64)  # [first, beyond]
    for first in range(sites):
        for beyond in range(first + 1, sites + 1):
            inside[first, beyond] = len(chain.inside(range(first, beyond)).rows)
    exactly = inside[:-1, 1:] - inside[1:, 1:] - inside[:-1, :-1] + inside[1:, :-1]
    return np.array([np.trace(exactly, offset=length - 1) for length in range(1, sites + 1)])
