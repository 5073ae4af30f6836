"""Names of gates against stim's table of gates."""

import pytest
import stim

from sweepmill.language.gates import GATES, ONE_SITE, RANDOM_GATES, SYNONYMS, TWO_SITES, canonical_gate

NOT_FIXED = {"II", "SPP", "SPP_DAG"}  # two identities, and products of any length
OURS = {"id": "I", "sdg": "S_DAG", "sx": "SQRT_X", "sxdg": "SQRT_X_DAG", "sy": "SQRT_Y", "sydg": "SQRT_Y_DAG"}


def by_stim(name: str) -> stim.Tableau:
    return stim.Tableau.from_named_gate(OURS.get(name, name.upper().replace("_DG", "_DAG")))


def test_every_definite_gate_is_one_of_stim_on_as_many_sites() -> None:
    definite = (*ONE_SITE, *TWO_SITES)
    assert set(GATES) == {*definite, *RANDOM_GATES}
    assert {name: (len(by_stim(name)),) for name in definite} == {name: GATES[name] for name in definite}


def test_every_name_of_stim_is_folded_to_a_gate_with_the_same_action() -> None:
    for name, gate in stim.gate_data().items():
        if gate.is_unitary and name not in NOT_FIXED:
            for alias in gate.aliases:
                assert by_stim(canonical_gate(alias)) == stim.Tableau.from_named_gate(name), alias


@pytest.mark.parametrize(
    ("name", "meant"),
    # names of OpenQASM 3's standard gates library (stdgates.inc); dcx: two CNOTs back to back, the second from b to a
    [
        ("id", "I 0"),
        ("sdg", "S_DAG 0"),
        ("sx", "SQRT_X 0"),
        ("cx", "CX 0 1"),
        ("CNOT", "CX 0 1"),
        ("swap", "SWAP 0 1"),
        ("cy", "CY 0 1"),
        ("cz", "CZ 0 1"),
        ("dcx", "CX 0 1\nCX 1 0"),
        ("sxdg", "SQRT_X_DAG 0"),
    ],
)
def test_names_of_openqasm_are_folded_to_a_gate_with_the_same_action(name: str, meant: str) -> None:
    assert by_stim(canonical_gate(name)) == stim.Tableau.from_circuit(stim.Circuit(meant))


def test_canonical_names_and_synonyms_are_stable() -> None:
    assert all(canonical_gate(name) == name for name in GATES)
    assert all(canonical_gate(name) == meant for name, meant in SYNONYMS.items())
    assert canonical_gate(" Uniform_Clifford ") == "uniform-clifford"


@pytest.mark.parametrize(
    ("name", "words"), [("cxx", "did you mean 'cx'"), ("t", "gates: uniform-clifford"), (3, "text")]
)
def test_an_unknown_gate_is_refused_with_what_would_pass(name: object, words: str) -> None:
    with pytest.raises(ValueError, match=words):
        canonical_gate(name)
