"""A script as an OpenQASM 3 program: registers for the chain, the references and what is discarded.

Source of the language: OpenQASM 3: a broader and deeper quantum assembly language, ACM Transactions on Quantum
Computing 3, 12 (2022), arXiv:2104.14722.
"""

from collections.abc import Iterator, Sequence
from itertools import count
from typing import Final

from sweepmill_worker.circuit_text.qasm_gates import definition, qasm_name
from sweepmill_worker.circuit_text.script import FORCED, LAYER, MEASURE, Instruction, Script

_TO_Z: Final = {"X": ("h",), "Y": ("sdg", "h"), "Z": ()}
_FROM_Z: Final = {"X": ("h",), "Y": ("h", "s"), "Z": ()}


def qasm_text(script: Script, title: Sequence[str]) -> str:
    """The text, comments included."""
    return "\n".join([*_head(script, title), *_body(script)]) + "\n"


def _head(script: Script, title: Sequence[str]) -> Iterator[str]:
    yield "OPENQASM 3.0;"
    yield from (f"// {line}" for line in title)
    yield 'include "stdgates.inc";'
    names = sorted({one.name for one in script.instructions} - {MEASURE, FORCED, LAYER})
    yield from (line for line in map(definition, names) if line is not None)
    registers = [("chain", script.sites), ("reference", script.references), ("discarded", script.discarded)]
    present = [(name, size) for name, size in registers if size]
    for name, size in present:
        yield f"qubit[{size}] {name};" + (" // not part of the state" if name == "discarded" else "")
    for name, kind in (("outcome", MEASURE), ("forced", FORCED)):
        if size := sum(one.name == kind for one in script.instructions):
            yield f"bit[{size}] {name};" + (" // keep runs with 0 only" if kind == FORCED else "")
    yield from (f"reset {name};" for name, _ in present)


def _body(script: Script) -> Iterator[str]:
    numbers = {MEASURE: count(), FORCED: count()}
    for one in script.instructions:
        qubits = [_qubit(script, q) for q in one.qubits]
        if one.name == LAYER:
            yield f"barrier chain; // {one.note} done"
        elif one.name in numbers:
            register = "outcome" if one.name == MEASURE else "forced"
            yield from _measurement(one.letters, qubits, f"{register}[{next(numbers[one.name])}]")
        else:
            yield _gate(one, qubits)


def _gate(one: Instruction, qubits: list[str]) -> str:
    return f"{qasm_name(one.name)} {', '.join(qubits)};" + (f" // {one.note}" if one.note else "")


def _measurement(letters: str, qubits: list[str], bit: str) -> Iterator[str]:
    """A Pauli product: turned into Z of every qubit, whose parity the last one takes; then all undone."""
    last = qubits[-1]
    turns = list(zip(letters, qubits, strict=True))
    parity = [f"cx {qubit}, {last};" for qubit in qubits[:-1]]
    yield from (f"{gate} {qubit};" for letter, qubit in turns for gate in _TO_Z[letter])
    yield from parity
    yield f"{bit} = measure {last};" + ("" if letters == "Z" else f" // {letters}")
    yield from reversed(parity)
    yield from (f"{gate} {qubit};" for letter, qubit in turns for gate in _FROM_Z[letter])


def _qubit(script: Script, qubit: int) -> str:
    for name, size in (("chain", script.sites), ("reference", script.references)):
        if qubit < size:
            return f"{name}[{qubit}]"
        qubit -= size
    return f"discarded[{qubit}]"
