"""The executor against density matrices: every kind of step, up to five qubits, entropies and random outcomes.

The matrices follow the same rows of operations, with outcomes drawn at random; entropies and randomness of a stabilizer
state do not depend on them.
"""

import random
from functools import reduce
from itertools import combinations
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray

from support.cliffords import ONE, Matrix, class_tableau
from support.programs import Form, form
from sweepmill_worker.clifford.classes import GATE_CLASSES
from sweepmill_worker.program import operations as op
from sweepmill_worker.program.compile import Program, compile_program
from sweepmill_worker.program.listing import operations
from sweepmill_worker.program.run import run_program

KEY = (3, 4)


class Dense:
    """A density matrix of a few qubits."""

    def __init__(self, program: Program, draw: random.Random) -> None:
        one = {"zeros": np.diag([1, 0]), "plus": np.full((2, 2), 0.5), "mixed": np.eye(2) / 2}[program.initial_state]
        self.qubits, self.draw = program.total, draw
        self.rho: Matrix = reduce(np.kron, [one] * program.sites + [np.diag([1, 0])] * program.references).astype(
            complex
        )

    def operator(self, matrix: Matrix, sites: list[int]) -> Matrix:
        """A matrix on some sites as one on all."""
        others = [q for q in range(self.qubits) if q not in sites]
        full: NDArray[Any] = np.kron(matrix, np.eye(2 ** len(others))).reshape([2] * 2 * self.qubits)
        order = np.argsort([*sites, *others])
        found: Matrix = full.transpose([*order, *(order + self.qubits)]).reshape(2**self.qubits, -1)
        return found

    def pauli(self, letters: str, sites: list[int]) -> Matrix:
        return self.operator(reduce(np.kron, [ONE[letter] for letter in letters]).astype(complex), sites)

    def conjugate(self, matrix: Matrix) -> None:
        self.rho = matrix @ self.rho @ matrix.conj().T

    def measure(self, pauli: Matrix) -> bool:
        identity = np.eye(len(pauli))
        kept = [(identity + sign * pauli) / 2 @ self.rho @ (identity + sign * pauli) / 2 for sign in (1, -1)]
        chances = [float(np.trace(part).real) for part in kept]
        random_ = min(chances) > 1e-9
        pick = self.draw.randrange(2) if random_ else int(chances[1] > 0.5)
        self.rho = kept[pick] / chances[pick]
        return random_

    def dephase(self, pauli: Matrix) -> None:
        self.rho = (self.rho + pauli @ self.rho @ pauli) / 2

    def reset(self, site: int) -> None:
        lower = self.operator(np.array([[0, 1], [0, 0]], dtype=complex), [site])
        zero = self.operator(np.diag([1, 0]).astype(complex), [site])
        self.rho = zero @ self.rho @ zero + lower @ self.rho @ lower.conj().T

    def run(self, row: list[int]) -> tuple[bool, bool]:
        """(random, counted)"""
        sites = row[op.SITE : op.SITE + row[op.SITES]]
        match row[op.CODE]:
            case op.GATE:
                table = GATE_CLASSES if len(sites) == 2 else op.ONE_SITE_CLASSES
                self.conjugate(self.operator(dense_gate(table[row[op.CLASS]]), sites))
                self.conjugate(self.pauli(letters_of(row[op.FRAME], len(sites)), sites))
            case op.MEASURE:
                pauli = self.pauli(letters_of(row[op.LETTERS], len(sites)), sites)
                if not row[op.FLAGS] & op.RECORDED:
                    self.dephase(pauli)
                    return False, False
                counted = not row[op.FLAGS] & op.FORCED
                return self.measure(pauli) and counted, counted
            case op.DEPOLARISE:
                for site in sites:
                    self.dephase(self.pauli("X", [site]))
                    self.dephase(self.pauli("Z", [site]))
            case op.RESET:
                for site in sites:
                    self.reset(site)
            case op.SWAP_IN:
                self.reset(sites[0])
                self.conjugate(self.operator((ONE["X"] + ONE["Z"]).astype(complex) / np.sqrt(2), sites))
                cx = np.eye(4, dtype=complex)[[0, 1, 3, 2]]
                self.conjugate(self.operator(cx, [sites[0], row[op.SITE + 1]]))
        return False, False

    def entropy(self, region: tuple[int, ...]) -> float:
        rest = [q for q in range(self.qubits) if q not in region]
        tensor = self.rho.reshape([2] * 2 * self.qubits)
        order = [*region, *rest]
        tensor = tensor.transpose([*order, *(q + self.qubits for q in order)])
        size = 2 ** len(region)
        reduced = np.einsum("ajbj->ab", tensor.reshape(size, 2 ** len(rest), size, -1))
        values = np.linalg.eigvalsh(reduced)
        values = values[values > 1e-12]
        return float(-(values * np.log2(values)).sum())


def dense_gate(matrix: NDArray[np.uint8]) -> Matrix:
    return np.array(class_tableau(matrix).to_unitary_matrix(endian="big"), dtype=complex)


def letters_of(number: int, sites: int) -> str:
    return "".join("IXYZ"[number // 4 ** (sites - 1 - q) % 4] for q in range(sites))


def random_step(draw: random.Random, sites: int, loses: bool, inside: int = 0) -> dict[str, Any]:
    """A step of any kind; `inside`: the width of the place that a choice hands down."""
    width = inside or draw.randint(1, min(4, sites))
    kinds = ["apply", "measure", "measure", "choose"] + ["measure lost", "depolarise", "reset"] * loses
    match draw.choice(kinds):
        case "apply" if width <= 2:
            names = [
                ["uniform-clifford", "h", "s", "sx", "c_xyz"],
                ["uniform-clifford", "cx", "cz", "iswap", "swap-class", "cnot-class", "iswap-class", "identity-class"],
            ]
            step: dict[str, Any] = {"apply": draw.choice(names[width - 1])}
            if width == 2 and ("uniform" in step["apply"] or "class" in step["apply"]) and draw.random() < 0.3:
                step["rotated"] = True
        case "measure lost":
            step = {"measure": "".join(draw.choices("XYZ", k=width)), "recorded": False}
        case "depolarise":
            step = {"depolarise": True}
        case "reset":
            step = {"reset": True}
        case "choose" if not inside:
            branches = [
                {"weight": draw.choice([1, 0.3]), "steps": [random_step(draw, sites, loses, width) for _ in range(n)]}
                for n in (1, 2, 0)
            ]
            return {"choose": branches, "on": random_places(draw, sites, width)}
        case _:
            step = {"measure": "".join(draw.choices("XYZ", k=width))}
            if draw.random() < 0.2:
                step["forced"] = True
    if draw.random() < 0.5:
        step["rate"] = draw.choice([0.3, 0.7])
    return step if inside else step | {"on": random_places(draw, sites, width)}


def random_places(draw: random.Random, sites: int, width: int) -> Any:
    places = {"places": [draw.sample(range(sites), width) for _ in range(draw.randint(1, 3))]}
    options: list[Any] = [places, {"blocks": {"width": width}} if sites > width else places]
    if width == 1:
        options += [
            "sites",
            {"random_sequential": {"count": 3, "of": "sites"}},
            {"sublattice": {"from": 1, "every": 2}},
        ]
    if width == 2:
        options += ["bonds", "bonds-from-0", {"random_pairs": {"count": 1, "exponent": 1.5}}]
    return draw.choice(options)


def random_form(seed: int) -> Form:
    draw = random.Random(seed)
    sites, loses = draw.choice([2, 3, 4, 4, 5]), draw.random() < 0.7
    more: Form = {
        "initial_state": draw.choice(["zeros", "plus", "mixed"]),
        "boundary": draw.choice(["periodic", "open"]),
    }
    if sites <= 3 and draw.random() < 0.7:
        swap = {"swap_in": "reference", "on": {"places": [[0], [sites - 1]]}}
        more["before"] = [[swap], [random_step(draw, sites, loses)]]
    if draw.random() < 0.3:
        more["after"] = [[random_step(draw, sites, loses)]]
    repeat = [[random_step(draw, sites, loses) for _ in range(draw.randint(1, 3))] for _ in range(draw.randint(1, 3))]
    return form(sites, 6, repeat, **more)


@pytest.mark.parametrize("block", range(15))
def test_entropies_and_random_outcomes_are_those_of_density_matrices(block: int) -> None:
    for seed in range(20 * block, 20 * block + 20):
        check_circuit(random_form(seed), seed)


def check_circuit(circuit: Form, seed: int) -> None:
    program = compile_program(circuit)
    regions = [r for n in range(1, program.total + 1) for r in combinations(range(program.total), n)]
    readings = run_program(program, KEY, seed, 2, range(1, program.layers + 1), regions)
    for index in range(2):
        dense = Dense(program, random.Random(seed))
        for layer in operations(program, KEY, seed + index):
            outcomes = [dense.run(row) for row in layer.rows.tolist()]
            if layer.number <= 0:
                continue
            at = layer.number - 1
            assert readings.random[index, at] == sum(random_ for random_, _ in outcomes), (circuit, layer.number)
            assert readings.measured[index, at] == sum(counted for _, counted in outcomes)
            expected = [dense.entropy(region) for region in regions]
            np.testing.assert_allclose(readings.entropies[index, at], expected, atol=0.01, err_msg=str(circuit))
