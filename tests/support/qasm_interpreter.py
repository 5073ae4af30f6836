"""Runs the few statements of OpenQASM 3 that circuits here consist of on stim, from the tree of another parser."""

from collections.abc import Mapping, Sequence
from typing import Any

import openqasm3
import stim
from openqasm3 import ast

STANDARD = {
    "id": "I",
    "x": "X",
    "y": "Y",
    "z": "Z",
    "h": "H",
    "s": "S",
    "sdg": "S_DAG",
    "sx": "SQRT_X",
    "cx": "CX",
    "cy": "CY",
    "cz": "CZ",
    "swap": "SWAP",
}
"""Gates of stdgates.inc by stim's names: common practice."""


class Interpreter:
    """The state and the bits after a program; anything it does not know is an error."""

    def __init__(self, text: str) -> None:
        """Raises what the parser raises where the text is no OpenQASM 3."""
        self.simulator = stim.TableauSimulator(seed=3)
        self.registers: dict[str, range] = {}
        self.bits: dict[str, list[int]] = {}
        self.barriers = 0
        self._gates: dict[str, ast.QuantumGateDefinition] = {}
        for statement in openqasm3.parse(text).statements:
            self._run(statement)

    def _run(self, statement: Any) -> None:
        match statement:
            case ast.Include():
                assert statement.filename == "stdgates.inc"
            case ast.QubitDeclaration():
                first = sum(map(len, self.registers.values()))
                self.registers[statement.qubit.name] = range(first, first + statement.size.value)
                self.simulator.set_num_qubits(first + statement.size.value)
            case ast.ClassicalDeclaration():
                self.bits[statement.identifier.name] = [0] * statement.type.size.value
            case ast.QuantumGateDefinition():
                self._gates[statement.name.name] = statement
            case ast.QuantumReset():
                self.simulator.reset(*self.registers[statement.qubits.name])
            case ast.QuantumBarrier():
                self.barriers += 1
            case ast.QuantumGate():
                self._gate(statement.name.name, [self._qubit(q) for q in statement.qubits])
            case ast.QuantumMeasurementStatement():
                outcome = self.simulator.measure(self._qubit(statement.measure.qubit))
                self.bits[statement.target.name.name][_index(statement.target)] = int(outcome)
            case _:
                raise AssertionError(f"unexpected statement {statement}")

    def _gate(self, name: str, qubits: Sequence[int]) -> None:
        if name in STANDARD:
            self.simulator.do(stim.CircuitInstruction(STANDARD[name], qubits))
            return
        defined = self._gates[name]
        places: Mapping[str, int] = dict(zip((q.name for q in defined.qubits), qubits, strict=True))
        for inner in defined.body:
            assert isinstance(inner, ast.QuantumGate)
            self._gate(inner.name.name, [places[q.name] for q in inner.qubits])

    def _qubit(self, node: Any) -> int:
        return self.registers[node.name.name][_index(node)]


def _index(node: Any) -> int:
    return int(node.indices[0][0].value)
