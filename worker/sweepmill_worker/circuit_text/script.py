"""One trajectory as a list of named instructions, before it is written in any language.

Whatever makes a state mixed is done with qubits that are never touched again: a discarded qubit starts in |0>, meets
the chain once and is traced out.  They are numbered after the chain and the reference qubits.
"""

from collections.abc import Iterable, Iterator
from typing import Final, NamedTuple

import numpy as np
from numpy.typing import NDArray

from sweepmill_worker.circuit_text.gates import named_gates
from sweepmill_worker.program import operations as op
from sweepmill_worker.reference.paulis import Row, row_pauli, row_sites, swapped

MEASURE: Final = "MEASURE"
FORCED: Final = "FORCED"
LAYER: Final = "LAYER"
"""Names of the instructions that are not gates; LAYER ends a layer, its note says which."""


class Instruction(NamedTuple):
    """A gate by stim's name, a measurement of the Pauli product `letters`, or the end of a layer."""

    name: str
    qubits: tuple[int, ...]
    letters: str = ""
    note: str = ""


class Script:
    """Grows by the operations of a trajectory."""

    def __init__(self, sites: int, references: int, initial_state: str) -> None:
        """`initial_state`: zeros, plus or mixed."""
        self.sites, self.references, self.discarded = sites, references, 0
        self.instructions: list[Instruction] = []
        self._untouched = set(range(sites)) if initial_state == "zeros" else set()
        if initial_state == "plus":
            for site in range(sites):
                self._add("H", site)
        elif initial_state == "mixed":
            halves = self._discard(sites)
            for half in halves:
                self._add("H", half, note="maximally mixed")
            for site, half in enumerate(halves):
                self._add("CX", half, site)

    @property
    def total(self) -> int:
        """All qubits."""
        return self.sites + self.references + self.discarded

    def layer(self, rows: NDArray[np.int32], name: str) -> None:
        """Append the operations of one layer."""
        for gates, others in _runs(rows.tolist()):
            self._gates(gates)
            for row in others:
                self._operation(row)
        self.instructions.append(Instruction(LAYER, (), note=name))

    def _gates(self, rows: list[Row]) -> None:
        """Gates on disjoint sites: those on pairs first, equal names together."""
        named = [
            [(gate.name, tuple(sites[q] for q in gate.qubits)) for gate in named_gates(*_numbers(row))]
            for row, sites in ((row, row_sites(row)) for row in rows)
        ]
        pairs = [[gate for gate in gates if len(gate[1]) == 2] for gates in named]
        stages = (
            sorted(gates[0] for gates in pairs if gates),
            sorted(gates[1] for gates in pairs if len(gates) > 1),
            sorted(gate for gates in named for gate in gates if len(gate[1]) == 1),
        )
        for name, qubits in (gate for stage in stages for gate in stage):
            self._add(name, *qubits)

    def _operation(self, row: Row) -> None:
        match row[op.CODE]:
            case op.MEASURE:
                self._measure(row)
            case op.DEPOLARISE:
                for site in row_sites(row):
                    self._mix(site, "depolarized")
            case op.RESET:
                for site in row_sites(row):
                    self._reset(site, "reset")
            case op.SWAP_IN:
                site, reference = swapped(row)
                if site not in self._untouched:
                    self._reset(site, "traced out for a reference qubit")
                self._add("H", site)
                self._add("CX", site, reference)

    def _measure(self, row: Row) -> None:
        letters, sites = row_pauli(row)
        if not row[op.FLAGS]:
            (coin,) = self._discard(1)
            self._add("H", coin, note=f"dephased in {letters}")
            for letter, site in zip(letters, sites, strict=True):
                self._add(f"C{letter}", coin, site)
        else:
            self._untouched -= set(sites)
            name = FORCED if row[op.FLAGS] & op.FORCED else MEASURE
            self.instructions.append(Instruction(name, sites, letters))

    def _mix(self, site: int, note: str) -> None:
        half, other = self._discard(2)
        self._add("H", half, note=note)
        self._add("CX", half, other)
        self._add("SWAP", half, site)

    def _reset(self, site: int, note: str) -> None:
        (fresh,) = self._discard(1)
        self._add("SWAP", fresh, site, note=note)

    def _discard(self, count: int) -> range:
        first = self.total
        self.discarded += count
        return range(first, first + count)

    def _add(self, name: str, *qubits: int, note: str = "") -> None:
        self._untouched -= set(qubits)
        self.instructions.append(Instruction(name, qubits, note=note))


def _numbers(row: Row) -> tuple[int, int, int]:
    return row[op.CLASS], row[op.FRAME], row[op.SITES]


def _runs(rows: Iterable[Row]) -> Iterator[tuple[list[Row], list[Row]]]:
    """Gates on disjoint sites and what follows them, in turns; the order of what shares a site is kept."""
    gates: list[Row] = []
    others: list[Row] = []
    busy: set[int] = set()
    for row in rows:
        is_gate = row[op.CODE] == op.GATE
        if is_gate and (others or busy & set(row_sites(row))):
            yield gates, others
            gates, others, busy = [], [], set()
        if is_gate:
            gates.append(row)
            busy |= set(row_sites(row))
        else:
            others.append(row)
    yield gates, others
