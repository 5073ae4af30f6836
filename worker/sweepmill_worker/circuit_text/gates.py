"""Every Clifford gate on one or two qubits as named gates: at most two on the pair, then one on each qubit.

The 720 classes are 20 cosets of the 36 local ones: nothing, or one of the nine gates "Pauli controlled by Pauli",
each with a SWAP after it or not.  What is left of a gate after its coset is local, and the 24 one-qubit gates all have
names, so that a Pauli frame costs no gate of its own.  Names are stim's.
"""

from functools import cache, lru_cache
from typing import Any, Final, NamedTuple

import stim

from sweepmill_worker.reference.paulis import gate_tableau

CONTROLLED: Final = ("CX", "CY", "CZ", "XCX", "XCY", "XCZ", "YCX", "YCY", "YCZ")
"""ACB: B acts on the second qubit where A of the first is -1; C without A means Z."""
_COSETS: Final = (
    (),
    ("SWAP",),
    *((name,) for name in CONTROLLED),
    *((name, "SWAP") for name in CONTROLLED),
)


class NamedGate(NamedTuple):
    """A gate by its name, on qubits of the place it belongs to."""

    name: str
    qubits: tuple[int, ...]


@lru_cache(maxsize=16 * 720 + 24)
def named_gates(gate_class: int, frame: int, sites: int) -> tuple[NamedGate, ...]:
    """The gate of a class with positive signs and then a Pauli frame, as gates on qubits 0 .. sites - 1, in order."""
    gate = gate_tableau(gate_class, frame, sites)
    coset = _coset(gate_class) if sites == 2 else ()
    rest = _pair_tableau(coset).inverse().then(gate) if sites == 2 else gate
    locals_ = [NamedGate(_one_qubit_names()[str(_local(rest, qubit))], (qubit,)) for qubit in range(sites)]
    return (*(NamedGate(name, (0, 1)) for name in coset), *(one for one in locals_ if one.name != "I"))


@cache
def _coset(gate_class: int) -> tuple[str, ...]:
    gate = gate_tableau(gate_class, 0, 2)
    return next(coset for coset in _COSETS if _is_local(_pair_tableau(coset).inverse().then(gate)))


@cache
def _pair_tableau(names: tuple[str, ...]) -> Any:
    total = stim.Tableau(2)
    for name in names:
        total = total.then(stim.gate_data(name).tableau)
    return total


def _is_local(gate: Any) -> bool:
    return all(output(q)[1 - q] == 0 for output in (gate.x_output, gate.z_output) for q in range(2))


def _local(gate: Any, qubit: int) -> Any:
    """What a local gate does to one qubit."""
    images = [image[qubit : qubit + 1] * image.sign for image in (gate.x_output(qubit), gate.z_output(qubit))]
    return stim.Tableau.from_conjugated_generators(xs=images[:1], zs=images[1:])


@cache
def _one_qubit_names() -> dict[str, str]:
    """Names of the 24 one-qubit Clifford gates by their tableaus as text."""
    found = stim.gate_data().values()
    return {str(one.tableau): one.name for one in found if one.is_unitary and one.is_single_qubit_gate}
