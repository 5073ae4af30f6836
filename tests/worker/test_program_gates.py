"""Named gates and rotated ones against dense matrices and stim."""

from itertools import product

import numpy as np
import pytest
import stim
from numpy.typing import NDArray

from support.cliffords import ONE, Matrix, class_tableau
from sweepmill.language.gates import GATES
from sweepmill_worker.clifford.classes import GATE_CLASSES
from sweepmill_worker.program.gates import named_gate, random_classes
from sweepmill_worker.program.operations import ONE_SITE_CLASSES
from sweepmill_worker.program.rotation import rotated_table

PAULIS: list[Matrix] = [np.kron(ONE[a], ONE[b]).astype(complex) for a, b in product("IXYZ", repeat=2)]


def unitary(number: int) -> Matrix:
    return np.array(class_tableau(GATE_CLASSES[number]).to_unitary_matrix(endian="big"), dtype=complex)


@pytest.mark.parametrize(
    ("name", "stim_name"),
    [
        ("h", "H"), ("x", "X"), ("s", "S"), ("sdg", "S_DAG"), ("sx", "SQRT_X"), ("sxdg", "SQRT_X_DAG"),
        ("c_xyz", "C_XYZ"), ("c_zyx", "C_ZYX"), ("sqrt_y", "SQRT_Y"), ("sqrt_y_dg", "SQRT_Y_DAG"), ("cx", "CX"),
        ("cy", "CY"), ("cz", "CZ"), ("swap", "SWAP"), ("iswap", "ISWAP"), ("iswap_dg", "ISWAP_DAG"),
        ("sqrt_xx", "SQRT_XX"), ("sqrt_zz_dg", "SQRT_ZZ_DAG"), ("xcz", "XCZ"),
    ],
)  # fmt: skip
def test_a_named_gate_is_its_class_followed_by_its_frame(name: str, stim_name: str) -> None:
    expected = stim.Tableau.from_named_gate(stim_name)
    sites = len(expected)
    number, frame = named_gate(name, sites)
    table = GATE_CLASSES if sites == 2 else ONE_SITE_CLASSES
    letters = [frame // 4 ** (sites - 1 - q) % 4 for q in range(sites)]
    pauli = stim.PauliString("".join("IXYZ"[letter] for letter in letters)).to_tableau()
    assert class_tableau(table[number]).then(pauli) == expected


def test_every_gate_of_the_language_is_known() -> None:
    for name, widths in GATES.items():
        for sites in widths:
            assert random_classes(name, sites) is not None or named_gate(name, sites)


def test_unknown_names_and_wrong_numbers_of_sites_are_refused() -> None:
    with pytest.raises(ValueError, match="no Clifford gate is called toffoli"):
        named_gate("toffoli", 2)
    with pytest.raises(ValueError, match="cx acts on 2 sites, not 1"):
        named_gate("cx", 1)
    with pytest.raises(ValueError, match="swap-class acts on 2 sites, not 1"):
        random_classes("swap-class", 1)


def test_classes_of_one_site_are_the_six_symplectic_matrices_in_order() -> None:
    codes = [int("".join(map(str, matrix.ravel())), 2) for matrix in ONE_SITE_CLASSES]
    assert codes == sorted(codes)
    assert len(codes) == 6
    assert all((int(m[0, 0]) * int(m[1, 1]) + int(m[0, 1]) * int(m[1, 0])) % 2 for m in ONE_SITE_CLASSES)


# Kinds of two-qubit Cliffords: 576, 5184, 5184, 576 of 11520, that is 16 Paulis times these numbers of classes; the
# rotated tensor has rank 1, 2, 4, 4.  Postselection-free entanglement dynamics via spacetime duality, Physical Review
# Letters 126, 060501 (2021), arXiv:2010.15840, and common practice.
KINDS = {"identity-class": (36, 1), "cnot-class": (324, 2), "iswap-class": (324, 4), "swap-class": (36, 4)}
MEMBERS = {"identity-class": "II", "cnot-class": "CX", "iswap-class": "ISWAP", "swap-class": "SWAP"}


def kinds() -> list[tuple[str, NDArray[np.int32]]]:
    found = [(name, random_classes(name, 2)) for name in KINDS]
    return [(name, classes) for name, classes in found if classes is not None]


def test_the_kinds_of_gates_have_their_published_sizes() -> None:
    assert {name: len(classes) for name, classes in kinds()} == {name: size for name, (size, _) in KINDS.items()}
    assert sorted(np.concatenate([classes for _, classes in kinds()])) == list(range(720))
    for name, classes in kinds():
        member = stim.Circuit(f"{MEMBERS[name].replace('II', 'I')} 0 1").to_tableau()
        same = [n for n in classes if same_symplectic(class_tableau(GATE_CLASSES[n]), member)]
        assert len(same) == 1


def same_symplectic(one: stim.Tableau, other: stim.Tableau) -> bool:
    return all((a == b).all() for a, b in zip(one.to_numpy()[:4], other.to_numpy()[:4], strict=True))


def test_a_rotated_gate_is_its_tensor_read_sideways_up_to_paulis() -> None:
    table = rotated_table()
    for name, classes in kinds():
        for number in classes.tolist():
            tensor = unitary(number).reshape(2, 2, 2, 2).transpose(0, 2, 1, 3)  # a' b' a b -> a' a b' b
            sideways = tensor.transpose(1, 0, 3, 2).reshape(4, 4)  # a a' ; b b'
            assert np.linalg.matrix_rank(sideways) == KINDS[name][1]
            count, first, second, after = table[number].tolist()
            assert 2**count * KINDS[name][1] == 4
            projected = [PAULIS[first], PAULIS[second]][:count]
            assert all(letters // 4 and letters % 4 for letters in (first, second)[:count])
            assert is_gate_after_projections(sideways, unitary(after), projected)


def is_gate_after_projections(sideways: Matrix, gate: Matrix, projected: list[Matrix]) -> bool:
    """Is it Pauli x gate x projector for some Pauli and signs?"""
    for signs in product((1, -1), repeat=len(projected)):
        kept = gate
        for sign, pauli in zip(signs, projected, strict=True):
            kept = kept @ (np.eye(4) + sign * pauli) / 2
        for pauli in PAULIS:
            candidate = pauli @ kept
            overlap = abs(np.vdot(candidate, sideways)) ** 2
            if np.isclose(overlap, np.vdot(candidate, candidate).real * np.vdot(sideways, sideways).real):
                return True
    return False
