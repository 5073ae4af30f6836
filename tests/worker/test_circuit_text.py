"""Circuits as text: what other programs make of them has the entropies of the signed simulation."""

import random

import numpy as np
import pytest
import stim

from support.qasm_interpreter import Interpreter
from support.rows import random_layer, row, table
from support.signed import entropies
from sweepmill_worker.circuit_text.gates import CONTROLLED, named_gates
from sweepmill_worker.circuit_text.qasm_text import qasm_text
from sweepmill_worker.circuit_text.script import Instruction, Script
from sweepmill_worker.circuit_text.stim_text import stim_text
from sweepmill_worker.program import operations as op
from sweepmill_worker.reference.paulis import gate_tableau
from sweepmill_worker.reference.trajectory import SignedTrajectory, outcome_bits

KEY = (0x0123ABCD, 0xDEADBEEF)


def circuit_tableau(gates: list[tuple[str, tuple[int, ...]]], sites: int) -> stim.Tableau:
    circuit = stim.Circuit()
    circuit.append("I", range(sites))
    for name, qubits in gates:
        circuit.append(name, qubits)
    return stim.Tableau.from_circuit(circuit)


@pytest.mark.parametrize(("sites", "classes"), [(1, 6), (2, 720)])
def test_every_class_and_frame_is_three_or_so_named_gates_with_the_right_signs(sites: int, classes: int) -> None:
    counts = []
    for gate_class in range(classes):
        for frame in {0, gate_class % 4**sites, (7 * gate_class + 5) % 4**sites}:
            gates = named_gates(gate_class, frame, sites)
            assert circuit_tableau(list(gates), sites) == gate_tableau(gate_class, frame, sites)
            counts.append(len(gates))
    assert max(counts) <= 2 * sites
    assert np.mean(counts) < 3.4


def test_every_gate_named_for_openqasm_is_what_stim_means_by_it() -> None:
    known = [one for one in stim.gate_data().values() if one.is_unitary]
    gates = [(one.name, 1) for one in known if one.is_single_qubit_gate] + [(one, 2) for one in (*CONTROLLED, "SWAP")]
    assert len(gates) == 34
    script = Script(4 * len(gates), 0, "zeros")
    circuit = stim.Circuit()
    for first, (name, size) in zip(range(0, script.sites, 4), gates, strict=True):
        # On halves of Bell pairs, so that the state tells the gate apart from its phase.
        for qubit in range(size):
            _append(script, circuit, "H", first + qubit)
            _append(script, circuit, "CX", first + qubit, first + 2 + qubit)
        _append(script, circuit, name, *range(first, first + size))
    expected = stim.TableauSimulator()
    expected.do(circuit)
    found = Interpreter(qasm_text(script, ["every gate"])).simulator
    assert found.canonical_stabilizers() == expected.canonical_stabilizers()


def _append(script: Script, circuit: stim.Circuit, name: str, *qubits: int) -> None:
    script.instructions.append(Instruction(name, qubits))
    circuit.append(name, qubits)


CASES = [(sites, state, seed) for seed, sites in enumerate((2, 3, 4, 5, 6)) for state in ("zeros", "plus", "mixed")]


@pytest.mark.parametrize(("sites", "initial_state", "seed"), CASES)
def test_both_texts_have_the_entropies_of_the_signed_simulation(sites: int, initial_state: str, seed: int) -> None:
    draw = random.Random(seed)
    references = draw.randint(0, 2)
    layers = [random_layer(draw, sites, draw.randint(0, 12)) for _ in range(4)]
    layers.insert(1, table([row(op.SWAP_IN, [draw.randrange(sites), sites + i]) for i in range(references)]))
    reference = SignedTrajectory(sites, references, initial_state)
    script = Script(sites, references, initial_state)
    for number, rows in enumerate(layers, start=1):
        reference.play(rows, number, outcome_bits(KEY, number, seed))
        script.layer(rows, f"layer {number}")
    total = sites + references
    regions = [tuple(q for q in range(total) if mask >> q & 1) for mask in range(2**total)]
    expected = entropies(reference.state.stabilizers(), total, regions)

    circuit = stim.Circuit(stim_text(script, ["a trajectory"]))
    simulator = stim.TableauSimulator(seed=seed)
    simulator.set_num_qubits(script.total)
    simulator.do(circuit)
    assert circuit.num_ticks == len(layers)
    assert entropies(simulator.canonical_stabilizers(), script.total, regions) == expected

    program = Interpreter(qasm_text(script, ["a trajectory"]))
    assert program.barriers == len(layers)
    assert program.simulator.num_qubits == script.total
    assert entropies(program.simulator.canonical_stabilizers(), script.total, regions) == expected
    recorded = len(reference.record.measurements)
    assert len(program.bits.get("outcome", [])) == recorded
    assert circuit.num_measurements == recorded + len(program.bits.get("forced", []))


def test_a_short_circuit_as_stim_text() -> None:
    script = _short()
    assert (
        stim_text(script, ["a short circuit"])
        == """\
# a short circuit
# qubits 0 .. 2: the chain
# qubits 3 .. 3: references
# qubits 4 .. 7: discarded, not part of the state
H 0
CX 0 3
TICK # before 1 done
CX 0 1
S 0
X 2
M 0 2
MPP X1*Y2 Z0*Z1
MX 1 # forced: keep runs with 0 here
TICK # layer 1 done
H 4 # dephased in ZZ
CZ 4 0 4 1
H 5 # depolarized
CX 5 6
SWAP 5 2
SWAP 7 0 # reset
TICK # layer 2 done
"""
    )


def test_a_short_circuit_as_openqasm() -> None:
    assert (
        qasm_text(_short(), ["a short circuit"])
        == """\
OPENQASM 3.0;
// a short circuit
include "stdgates.inc";
qubit[3] chain;
qubit[1] reference;
qubit[4] discarded; // not part of the state
bit[4] outcome;
bit[1] forced; // keep runs with 0 only
reset chain;
reset reference;
reset discarded;
h chain[0];
cx chain[0], reference[0];
barrier chain; // before 1 done
cx chain[0], chain[1];
s chain[0];
x chain[2];
outcome[0] = measure chain[0];
outcome[1] = measure chain[2];
h chain[1];
sdg chain[2];
h chain[2];
cx chain[1], chain[2];
outcome[2] = measure chain[2]; // XY
cx chain[1], chain[2];
h chain[1];
h chain[2];
s chain[2];
cx chain[0], chain[1];
outcome[3] = measure chain[1]; // ZZ
cx chain[0], chain[1];
h chain[1];
forced[0] = measure chain[1]; // X
h chain[1];
barrier chain; // layer 1 done
h discarded[0]; // dephased in ZZ
cz discarded[0], chain[0];
cz discarded[0], chain[1];
h discarded[1]; // depolarized
cx discarded[1], discarded[2];
swap discarded[1], chain[2];
swap discarded[3], chain[0]; // reset
barrier chain; // layer 2 done
"""
    )


def _short() -> Script:
    script = Script(3, 1, "zeros")
    script.layer(table([row(op.SWAP_IN, [0, 3])]), "before 1")
    gate = next(c for c in range(720) if named_gates(c, 0, 2) == (("CX", (0, 1)), ("S", (0,))))
    identity = next(c for c in range(6) if not named_gates(c, 0, 1))
    script.layer(
        table(
            [
                row(op.GATE, [0, 1], gate),
                row(op.GATE, [2], identity, frame=1),
                row(op.MEASURE, [0], letters="Z", flags=op.RECORDED),
                row(op.MEASURE, [2], letters="Z", flags=op.RECORDED),
                row(op.MEASURE, [1, 2], letters="XY", flags=op.RECORDED),
                row(op.MEASURE, [0, 1], letters="ZZ", flags=op.RECORDED),
                row(op.MEASURE, [1], letters="X", flags=op.RECORDED | op.FORCED),
            ]
        ),
        "layer 1",
    )
    script.layer(
        table(
            [
                row(op.MEASURE, [0, 1], letters="ZZ"),
                row(op.DEPOLARISE, [2]),
                row(op.RESET, [0]),
            ]
        ),
        "layer 2",
    )
    return script
