"""The circuits of every family as text: run by others, they have the entropies that the executor reads."""

import pytest
import stim

from support.families import SMALL, label, regions_of
from support.qasm_interpreter import Interpreter
from support.random_programs import random_ensemble
from support.signed import entropies
from sweepmill.ensemble import Ensemble
from sweepmill.messages import CircuitFormat
from sweepmill.presets import layered_form
from sweepmill_worker.circuit_text.write import TooLong, circuit_text
from sweepmill_worker.program.compile import compile_program
from sweepmill_worker.program.run import run_program

WRITTEN = [random_ensemble(seed, 4 + seed % 4, 3) for seed in range(12)]


@pytest.mark.parametrize("ensemble", SMALL + WRITTEN, ids=label)
def test_texts_have_the_entropies_of_the_executor(ensemble: Ensemble) -> None:
    program = compile_program(layered_form(ensemble))
    regions = regions_of(program.sites, program.total, 4)
    readings = run_program(program, ensemble.key_words, 4, 1, [program.layers], regions)
    expected = readings.entropies[0, 0].tolist()

    circuit = stim.Circuit(circuit_text(ensemble, 4, "stim"))
    simulator = stim.TableauSimulator(seed=2)
    simulator.set_num_qubits(program.total)
    simulator.do(circuit)
    assert entropies(simulator.canonical_stabilizers(), simulator.num_qubits, regions) == expected
    assert circuit.num_ticks == program.before + program.layers

    run = Interpreter(circuit_text(ensemble, 4, "openqasm3"))
    assert entropies(run.simulator.canonical_stabilizers(), run.simulator.num_qubits, regions) == expected
    assert len(run.registers["chain"]) == program.sites
    assert len(run.registers.get("reference", ())) == program.references


def test_a_text_says_which_trajectory_it_is() -> None:
    ensemble = SMALL[0]
    comments: dict[CircuitFormat, str] = {"stim": "#", "openqasm3": "//"}
    for language, comment in comments.items():
        assert f"{comment} trajectory 3 of ensemble {ensemble.key}\n" in circuit_text(ensemble, 3, language)


def test_a_circuit_of_more_operations_than_wanted_is_refused() -> None:
    with pytest.raises(TooLong, match="more than 10 operations"):
        circuit_text(SMALL[4], 0, "stim", most=10)


def test_an_ensemble_of_another_revision_is_refused() -> None:
    old = Ensemble(SMALL[0].family, SMALL[0].parameters, revision=0)
    with pytest.raises(ValueError, match="the ensemble 0"):
        circuit_text(old, 0, "stim")
