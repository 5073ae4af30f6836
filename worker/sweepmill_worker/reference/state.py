"""A signed stabilizer state of some qubits, mixed or not: pure together with an environment that nobody reads."""

from collections.abc import Iterable, Sequence
from typing import Any, Final

import stim

from sweepmill_worker.reference.paulis import Pauli

MOST_QUBITS: Final = 2048
"""With its environment a tableau then has about 4096 qubits, 8 MB; beyond, a layer takes seconds."""
_SPARE: Final = 64
"""Fresh environment qubits of a mixed state; when they are used up the environment is made anew."""


class SignedState:
    """Qubits 0 .. qubits - 1 in the state that some commuting Pauli products stabilize, maximally mixed otherwise.

    The environment comes first in the simulator, so that canonical stabilizers without it come last.
    """

    def __init__(self, stabilizers: Sequence[Any], qubits: int) -> None:
        """`stabilizers`: of type `stim.PauliString` and length `qubits`, with their signs, +1 or -1.

        Raises ValueError for more qubits than this simulation is meant for.
        """
        if qubits > MOST_QUBITS:
            raise ValueError(f"the signed simulation takes at most {MOST_QUBITS} qubits, got {qubits}")
        self.qubits = qubits
        self._prepare(stabilizers, spare=0)

    def gate(self, tableau: Any, qubits: Iterable[int]) -> None:
        """Conjugate by a Clifford gate, a `stim.Tableau`."""
        self._simulator.do_tableau(tableau, [self._first + q for q in qubits])

    def expectation(self, pauli: Pauli) -> int:
        """-1, 0 or 1."""
        return int(self._simulator.peek_observable_expectation(self._string(pauli)))

    def project(self, pauli: Pauli, outcome: int) -> None:
        """Onto outcome 0 (+1) or 1 (-1). Raises ValueError if it has probability 0."""
        self._simulator.postselect_observable(self._string(pauli), desired_value=bool(outcome))

    def dephase(self, pauli: Pauli) -> None:
        """Apply the Pauli product or not, nobody knows which: the outcome of its measurement is lost."""
        (coin,) = self._fresh(1)
        self._simulator.h(coin)
        for letter, qubit in zip(*pauli, strict=True):
            {"X": self._simulator.cx, "Y": self._simulator.cy, "Z": self._simulator.cz}[letter](
                coin, self._first + qubit
            )

    def depolarize(self, qubit: int) -> None:
        """Make the qubit maximally mixed: half of a fresh Bell pair takes its place."""
        half, other = self._fresh(2)
        self._simulator.h(half)
        self._simulator.cx(half, other)
        self._simulator.swap(half, self._first + qubit)

    def reset(self, qubit: int) -> None:
        """Trace the qubit out and put |0> in its place."""
        (fresh,) = self._fresh(1)
        self._simulator.swap(fresh, self._first + qubit)

    def pair(self, left: int, right: int) -> None:
        """Take two qubits from |00> to the Bell state that XX and ZZ stabilize."""
        self._simulator.h(self._first + left)
        self._simulator.cx(self._first + left, self._first + right)

    def stabilizers(self) -> list[Any]:
        """Independent generators of the stabilizer group without the environment, as `stim.PauliString` with signs."""
        canonical = self._simulator.canonical_stabilizers()
        outside = self._first
        return [row[outside:] * row.sign for row in canonical if not row[:outside].weight]

    def _prepare(self, stabilizers: Sequence[Any], spare: int) -> None:
        pure, mixed = len(stabilizers), self.qubits - len(stabilizers)
        self._first, self._used = mixed + spare, mixed
        self._simulator = stim.TableauSimulator(seed=0)  # its own randomness is never asked for
        self._simulator.set_num_qubits(self._first + self.qubits)
        for i in range(mixed):
            self._simulator.h(i)
            self._simulator.cx(i, self._first + pure + i)
        if pure:
            frame = stim.Tableau.from_stabilizers(stabilizers, allow_underconstrained=True)
            self._simulator.do_tableau(frame, range(self._first, self._first + self.qubits))

    def _fresh(self, count: int) -> range:
        """Environment qubits in |0>. They never come back, so now and then an equal state with few is made."""
        if self._used + count > self._first:
            self._prepare(self.stabilizers(), _SPARE)
        self._used += count
        return range(self._used - count, self._used)

    def _string(self, pauli: Pauli) -> Any:
        string = stim.PauliString(self._first + self.qubits)
        for letter, qubit in zip(*pauli, strict=True):
            string[self._first + qubit] = letter
        return string
