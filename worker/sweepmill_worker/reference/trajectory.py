"""One signed trajectory: a state and its record, layer by layer.

Outcomes are Born's: where both are possible the top bit of the outcome word of the row decides, 0 for +1.  Words of
outcomes have kinds of their own, so the circuit is the one that the sign-free executor draws, and the record is a
pure function of (ensemble key, k) like the circuit.

A forced outcome is +1.  Circuits with forced outcomes end in a uniformly random Pauli frame, which turns the signs of
what is measured: where +1 has probability 0 in the frame at hand, -1 is taken, as +1 would be in half of the frames.
The stabilizer group apart from signs is the same, and the record says how often it happened.
"""

from collections.abc import Callable
from typing import Final

import numpy as np
import stim
from numpy.typing import NDArray

from sweepmill_worker.program import operations as op
from sweepmill_worker.reference.paulis import Pauli, Row, row_pauli, row_sites, row_tableau, swapped
from sweepmill_worker.reference.record import Measurement, Record
from sweepmill_worker.reference.state import SignedState
from sweepmill_worker.words import fill

_START: Final = {"zeros": "Z", "plus": "X", "mixed": "_"}
Bit = Callable[[int, int], int]
"""The outcome of a random measurement, 0 or 1, by kind and place of its word."""


class SignedTrajectory:
    """The state of a chain and its reference qubits, numbered after the sites of the chain."""

    def __init__(self, sites: int, references: int, initial_state: str) -> None:
        """`initial_state`: zeros, plus or mixed; reference qubits wait in |0>. Raises ValueError for too many."""
        start = _START[initial_state] * sites + "Z" * references
        strings = [("_" * i + letter).ljust(len(start), "_") for i, letter in enumerate(start) if letter != "_"]
        self.state = SignedState([stim.PauliString(one) for one in strings], len(start))
        self.record = Record()

    def play(self, rows: NDArray[np.int32], number: int, bit: Bit) -> tuple[int, int]:
        """Do the operations of layer `number`; the counts of its random and of all its recorded measurements."""
        done = len(self.record.measurements)
        for row in rows.tolist():
            self._do(row, number, bit)
        new = self.record.measurements[done:]
        return sum(one.random for one in new), len(new)

    def _do(self, row: Row, number: int, bit: Bit) -> None:
        sites = row_sites(row)
        match row[op.CODE]:
            case op.GATE:
                self.state.gate(row_tableau(row), sites)
            case op.MEASURE:
                self._measure(row, row_pauli(row), number, bit)
            case op.DEPOLARISE:
                for site in sites:
                    self.state.depolarize(site)
            case op.RESET:
                for site in sites:
                    self.state.reset(site)
            case op.SWAP_IN:
                site, reference = swapped(row)
                self.state.reset(site)
                self.state.pair(site, reference)
            case code:
                raise ValueError(f"no operation has the code {code}")

    def _measure(self, row: Row, pauli: Pauli, number: int, bit: Bit) -> None:
        flags = row[op.FLAGS]
        if not flags & (op.RECORDED | op.FORCED):
            self.state.dephase(pauli)
            return
        expected = self.state.expectation(pauli)
        if flags & op.FORCED:
            self._force(pauli, expected)
            return
        outcome = (1 - expected) // 2 if expected else bit(row[op.KIND], row[op.PLACE])
        if not expected:
            self.state.project(pauli, outcome)
        letters, sites = pauli
        self.record.measurements.append(Measurement(number, sites, letters, outcome, not expected))

    def _force(self, pauli: Pauli, expected: int) -> None:
        if expected == 0:
            self.state.project(pauli, 0)
            self.record.halved += 1
        elif expected < 0:
            self.record.impossible += 1


def outcome_bits(key_words: tuple[int, int], layer_word: int, k: int) -> Bit:
    """Outcomes of one layer of trajectory k from its outcome words."""

    def bit(kind: int, place: int) -> int:
        block = np.array([(kind << 24) + place // 4], dtype=np.uint32)
        four = np.empty(4, dtype=np.uint32)
        fill(four, block, np.zeros_like(block), layer_word, np.uint64(k), key_words)
        return int(four[place % 4]) >> 31

    return bit
