"""One patch of a unitary Clifford brickwork read in its two directions, signs dropped.

Forward, on stim: a chain whose site 0 is given to a bath after every layer.  Sideways, in plain Python: columns of
gates act on time slices, from the last site to site 0.  Slice m of a site is the leg of its world line after layer m;
a gate of layer n on the sites x, x + 1 takes the slices n - 1, n of site x + 1 to those of site x.  (Postselection-free
entanglement dynamics via spacetime duality, PRL 126, 060501 (2021), 2010.15840; the bookkeeping is worked out here.)
"""

from collections.abc import Callable, Mapping, Sequence
from functools import cache

import numpy as np
import stim
from numpy.typing import NDArray

from support.stabilizer_enumeration import Group, reduced, restricted
from support.stim_oracle import rank, tableau
from sweepmill_worker.clifford.classes import GATE_CLASSES
from sweepmill_worker.program.rotation import rotated_table

Gates = Mapping[tuple[int, int], int]
"""(layer, left site): gate class.  Layer n acts on (0,1), (2,3), ... if n is odd, on (1,2), ... if it is even."""


class Bath:
    """An open chain; its site 0 is swapped with half of a fresh Bell pair after every layer."""

    def __init__(self, sites: int, gates: Gates, mixed: bool) -> None:
        self.sites, self.gates = sites, gates
        self.layer = 0
        self.simulator = stim.TableauSimulator(seed=1)
        self.kept = list(range(2 * sites if mixed else sites))
        """The chain, and its purifier if it starts maximally mixed."""
        self.qubits = len(self.kept)
        if mixed:
            self.simulator.h(*range(sites))
            self.simulator.cx(*(q for site in range(sites) for q in (site, sites + site)))

    def advance(self) -> None:
        """A layer of gates, then the exchange."""
        self.layer += 1
        for left in range((self.layer + 1) % 2, self.sites - 1, 2):
            self.simulator.do_tableau(tableau(self.gates[self.layer, left]), [left, left + 1])
        half, other = self.qubits, self.qubits + 1
        self.qubits += 2
        self.simulator.h(half)
        self.simulator.cx(half, other)
        self.simulator.swap(0, half)

    def entropy(self) -> int:
        """Of the chain and its purifier."""
        _, _, xs, zs, _, _ = self.simulator.current_inverse_tableau().inverse().to_numpy()
        columns = [int.from_bytes(np.packbits(part[:, q]).tobytes(), "big") for q in self.kept for part in (xs, zs)]
        return rank(columns) - len(self.kept)


@cache
def image_table(gate_class: int) -> tuple[int, ...]:
    """Images of the 16 Paulis of two sites under a class, bits 0 .. 3: x and z of the left, x and z of the right."""
    rows = [sum(int(bit) << i for i, bit in enumerate(row)) for row in GATE_CLASSES[gate_class]]
    images = [0] * 16
    for pauli in range(16):
        for i, row in enumerate(rows):
            images[pauli] ^= row * (pauli >> i & 1)
    return tuple(images)


def commute(a: int, b: int) -> bool:
    """Do two Paulis of any number of legs commute?"""
    x = int("01" * max(1, (max(a, b).bit_length() + 1) // 2), 2)
    return ((a & x) & (b >> 1) & x).bit_count() % 2 == ((a >> 1) & x & b).bit_count() % 2


class Legs:
    """A pure stabilizer state of as many legs as were made; bit 2q of a row: X of leg q, bit 2q + 1: Z."""

    def __init__(self) -> None:
        self.rows: list[int] = []
        self.count = 0
        self.certain = 0
        """Projections whose outcome was certain: there the sign would matter."""

    def zero(self) -> int:
        """A leg in |0>."""
        self.rows.append(2 << 2 * self.count)
        self.count += 1
        return self.count - 1

    def pair(self) -> tuple[int, int]:
        """Two legs in a Bell pair."""
        a, b = self.count, self.count + 1
        self.rows += [1 << 2 * a | 1 << 2 * b, 2 << 2 * a | 2 << 2 * b]
        self.count += 2
        return a, b

    def project(self, pauli: int) -> None:
        """Force an outcome."""
        hit = [row for row in self.rows if not commute(row, pauli)]
        if not hit:
            self.certain += 1
            return
        kept = (row if commute(row, pauli) else row ^ hit[0] for row in self.rows if row != hit[0])
        self.rows = [*kept, pauli]

    def gate(self, gate_class: int, a: int, b: int) -> None:
        """Conjugate the legs a (left) and b by a class."""
        images = image_table(gate_class)
        self.rows = [self._image(row, images, a, b) for row in self.rows]

    @staticmethod
    def _image(row: int, images: Sequence[int], a: int, b: int) -> int:
        old = row >> 2 * a & 3 | (row >> 2 * b & 3) << 2
        change = old ^ images[old]
        return row ^ (change & 3) << 2 * a ^ (change >> 2) << 2 * b

    def single(self, matrix: NDArray[np.uint8], leg: int) -> None:
        """Conjugate a leg by a class of one site: rows are the images (x, z) of X and Z."""
        of_x, of_z = (int(row[0]) | int(row[1]) << 1 for row in matrix)
        images = [0, of_x, of_z, of_x ^ of_z]
        self.rows = [row ^ (row >> 2 * leg & 3 ^ images[row >> 2 * leg & 3]) << 2 * leg for row in self.rows]

    def rotated(self, gate_class: int, a: int, b: int) -> None:
        """The sideways tensor of a class on the slices (a, b) of the right site."""
        count, *letters, after = rotated_table()[gate_class].tolist()
        for pair in letters[:count]:
            self.project(letter_bits(pair // 4) << 2 * a | letter_bits(pair % 4) << 2 * b)
        self.gate(after, a, b)

    def entropy(self, legs: Sequence[int]) -> int:
        """Of a region of a pure state: rank of the restriction minus the size."""
        return restricted(tuple(self.rows), legs) - len(legs)


def letter_bits(letter: int) -> int:
    """x + 2 z of 0 I, 1 X, 2 Y, 3 Z."""
    return (0, 1, 3, 2)[letter]


class Columns:
    """The same patch column by column; legs at the final time, and of the open bottom, are kept and never looked at."""

    def __init__(self, sites: int, layers: int, gates: Gates, product: bool) -> None:
        self.sites, self.layers, self.gates, self.product = sites, layers, gates, product
        self.legs = Legs()
        self.slices: dict[int, int] = {}
        self._start()
        for site in range(sites - 2, -1, -1):
            self._column(site)
        if layers % 2 == 0:  # what the bath gives after the last odd layer meets no gate
            self.slices[layers] = self.legs.pair()[0]

    def _bottom(self) -> int:
        """The first leg of a world line: |0>, or half of a pair with the purifier."""
        return self.legs.zero() if self.product else self.legs.pair()[0]

    def _start(self) -> None:
        first = 2 - (self.sites - 1) % 2
        self.slices[first - 1] = self._bottom()
        for n in range(first, self.layers + 1, 2):
            self.slices[n], self.slices[n + 1] = self.legs.pair()

    def _column(self, site: int) -> None:
        parity = (site + 1) % 2
        if site < self.sites - 2:
            if parity == 1:
                self.slices[0] = self._bottom()
            if self.layers % 2 == parity:
                self.slices[self.layers] = self.legs.pair()[0]
        for n in range(2 - parity, self.layers + 1, 2):
            self.legs.rotated(self.gates[n, site], self.slices[n - 1], self.slices[n])
        if parity == 1 and self.product:
            self.legs.project(2 << 2 * self.slices[0])

    def entropy(self, last: int) -> int:
        """Of the slices 1 .. last of site 0."""
        return self.legs.entropy([self.slices[m] for m in range(1, last + 1)])


def related(group: Group, gate_class: int) -> Group:
    """The rotated class on legs 0 and 1 of a group by its definition: all (l, rest) with (r, rest) in the group.

    l = (p_a, q_a) is related to r = (p_b, q_b) if the class maps (p_a, p_b) to (q_a, q_b).
    """
    images = image_table(gate_class)
    partners: dict[int, list[int]] = {}
    for before, after in enumerate(images):
        partners.setdefault(before >> 2 | after & 12, []).append(before & 3 | (after & 3) << 2)
    elements = [0]
    for row in group:
        elements += [row ^ element for element in elements]
    return reduced(e & ~15 | left for e in elements for left in partners.get(e & 15, []))


def random_gates(sites: int, layers: int, draw: Callable[[], int]) -> Gates:
    """A class for every bond of every layer."""
    return {(n, left): draw() for n in range(1, layers + 1) for left in range((n + 1) % 2, sites - 1, 2)}
