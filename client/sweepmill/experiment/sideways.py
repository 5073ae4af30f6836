"""The unitary circuit that prepares a space-time rotated state in the laboratory, and what it takes.

A rotated Clifford circuit has time slices for sites and columns of a brickwork for layers. The laboratory runs the same
brickwork in the ordinary direction and collects the time slices of its edge qubit (Postselection-free entanglement
dynamics via spacetime duality, Phys. Rev. Lett. 126, 060501 (2021), arXiv:2010.15840). Slice n is what the edge qubit
carries after layer n. Odd layers act on it: their output, an odd slice, is taken out. Even layers leave it alone: an
even slice is the partner of the fresh half of a Bell pair that enters in place of what was taken out.
"""

from dataclasses import asdict, dataclass
from math import log2
from typing import Any


@dataclass(frozen=True)
class Sideways:
    """Brickwork of D + 1 qubits and T layers of which the slices [first, first + window) of the edge are held.

    What enters at slices that are not held is maximally mixed: a basis state drawn anew in every run.
    """

    columns: int
    layers: int
    first: int
    window: int

    def __post_init__(self) -> None:
        """Raises ValueError for counts that do not fit together."""
        if self.columns < 1 or self.layers < 1 or self.layers % 2 == 0:
            raise ValueError(f"needs columns and an odd number of layers, got {self.columns} and {self.layers}")
        if self.first < 0 or self.window < 1 or self.first + self.window > self.layers + 1:
            raise ValueError(f"slices are 0 to {self.layers}: {self.window} from {self.first} are not among them")

    @property
    def chain(self) -> int:
        """Qubits of the brickwork."""
        return self.columns + 1

    @property
    def held(self) -> range:
        """The slices that are held, one ancilla each."""
        return range(self.first, self.first + self.window)

    @property
    def taken_out(self) -> int:
        """Qubits swapped out of the edge: the odd slices."""
        return sum(n % 2 for n in self.held)

    @property
    def bell_pairs(self) -> int:
        """Fresh Bell pairs of which one half enters at the edge: the even slices."""
        return self.window - self.taken_out

    @property
    def qubits(self) -> int:
        """All qubits, if each slice has an ancilla of its own."""
        return self.chain + self.window

    @property
    def gates(self) -> int:
        """Two-qubit gates of the brickwork."""
        return (self.layers + 1) // 2 * (self.chain // 2) + (self.layers - 1) // 2 * (self.columns // 2)

    @property
    def final_legs(self) -> int:
        """Qubits of the chain left at the end beside the edge: traced, or measured once if they are projected."""
        return self.columns

    @property
    def log2_purity(self) -> float | None:
        """log2 of the mean purity of the held slices, exact (`window_purity`); None inside a narrower light cone."""
        wide = self.columns >= max(1, self.window // 2) and self.window <= 2 * self.columns + 1
        if not wide or (self.window % 2 == 0) != (self.first % 2 == 0):
            return None
        return log2(window_purity(self.window))

    def to_dict(self) -> dict[str, Any]:
        """Plain values."""
        return {
            **asdict(self),
            "chain_qubits": self.chain,
            "ancillas": self.window,
            "qubits": self.qubits,
            "taken_out_at_the_edge": self.taken_out,
            "bell_pairs": self.bell_pairs,
            "two_qubit_gates": self.gates,
            "mid_circuit_measurements": 0,
            "final_measurements_if_projected": self.final_legs,
            "post_selected_bits_if_traced": 0,
            "post_selected_bits_if_projected_at_most": self.final_legs,
            "entropy_at_least": None if self.log2_purity is None else -self.log2_purity,
        }


def sideways_circuit(window: int) -> Sideways:
    """The smallest patch in which so many slices have exactly their steady state: the light cone of the window.

    An even window is a stack of whole gates at the edge, an odd one ends with the outputs of gates. Raises ValueError.
    """
    first = window % 2
    return Sideways(max(1, window // 2), first + window - 1, first, window)


def window_purity(window: int) -> float:
    """Mean over uniform Clifford gates of the purity of a window of slices in the steady state.

    Averages of two copies of a gate turn into two walls of a random walk with hops .16 (.36 at rest next to the other
    wall): u_0(h) = [h = 0], u_k+1(h) = .16 u_k(h - 1) + .32 u_k(h) + .16 u_k(h + 1). An odd window of 2k + 1 slices,
    outputs at both ends, has the sum of u_k(h) 2^-(2h+1); an even one of k whole gates that of u_k(h) 4^-h, because
    the outer leg of an output whose past is traced is one maximally mixed qubit. The entropy is at least -log2 of it.
    Derived from the average over two-qubit Cliffords, which is a 2-design.
    """
    if window < 1:
        raise ValueError(f"a window has at least one slice, got {window}")
    walk = [1.0]
    for _ in range(window // 2):
        padded = [0.0, *walk, 0.0, 0.0]
        walk = [0.16 * padded[h] + 0.32 * padded[h + 1] + 0.16 * padded[h + 2] for h in range(len(walk) + 1)]
        walk[0] += 0.04 * padded[1]
    return sum(chance * 4.0**-h for h, chance in enumerate(walk)) / (2 if window % 2 else 1)
