"""The same circuits on stim: signed, with destabilizers, from another code base."""

from collections.abc import Iterable, Sequence
from functools import cache

import numpy as np
import stim
from numpy.typing import NDArray

from sweepmill_worker.clifford.engine import GATE_CLASSES, HybridChain, Layer


def pauli(vector: Iterable[int]) -> stim.PauliString:
    """The Pauli string of (x_left, z_left, x_right, z_right)."""
    x_left, z_left, x_right, z_right = (bool(bit) for bit in vector)
    return stim.PauliString.from_numpy(xs=np.array([x_left, x_right]), zs=np.array([z_left, z_right]))


@cache
def tableau(gate_class: int) -> stim.Tableau:
    """A gate of the class, with all signs positive."""
    x_left, z_left, x_right, z_right = (pauli(row) for row in GATE_CLASSES[gate_class])
    return stim.Tableau.from_conjugated_generators(xs=[x_left, x_right], zs=[z_left, z_right])


def rank(vectors: Iterable[int]) -> int:
    """Rank over GF(2) of vectors written as Python integers."""
    basis: dict[int, int] = {}
    for vector in vectors:
        while vector and vector.bit_length() in basis:
            vector ^= basis[vector.bit_length()]
        if vector:
            basis[vector.bit_length()] = vector
    return len(basis)


class Reference:
    """A chain on stim; a mixed one is half of Bell pairs with as many reference qubits."""

    def __init__(self, chain: HybridChain) -> None:
        self.sites = chain.sites
        self.simulator = stim.TableauSimulator(seed=7)
        self.simulator.set_num_qubits(chain.sites * (2 if chain.mixed else 1))
        if chain.mixed:
            for site in range(chain.sites):
                self.simulator.h(site)
                self.simulator.cx(site, chain.sites + site)

    def apply(self, layer: Layer) -> int:
        """One layer; returns the number of random outcomes."""
        for left, right, gate_class in layer.gates:
            self.simulator.do_tableau(tableau(gate_class), [left, right])
        random = 0
        for site in layer.measured:
            random += self.simulator.peek_z(site) == 0
            self.simulator.measure(site)
        return random

    def rows(self) -> tuple[NDArray[np.uint8], NDArray[np.uint8]]:
        """X and Z parts of the stabilizers [rows, sites], reference qubits included."""
        _, _, z_to_x, z_to_z, _, _ = self.simulator.current_inverse_tableau().inverse().to_numpy()
        return z_to_x.astype(np.uint8), z_to_z.astype(np.uint8)

    def entropies(self, regions: Sequence[tuple[int, ...]]) -> list[int]:
        """Rank of the stabilizers restricted to the region, minus its size, from columns as integers."""
        _, _, z_to_x, z_to_z, _, _ = self.simulator.current_inverse_tableau().inverse().to_numpy()
        columns = [
            [int.from_bytes(np.packbits(part[:, site]).tobytes(), "big") for part in (z_to_x, z_to_z)]
            for site in range(self.sites)
        ]
        return [rank(vector for site in region for vector in columns[site]) - len(region) for region in regions]
