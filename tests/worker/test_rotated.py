"""Gates read sideways: their action on groups, and the edge bath they are the other side of, circuit by circuit."""

import random
from collections.abc import Callable

import numpy as np
import pytest

from support.sideways import Bath, Columns, Legs, random_gates, related
from support.stabilizer_enumeration import reduced
from sweepmill_worker.program.rotation import rotated_table

CLASSES = 720


def drawer(seed: int) -> Callable[[], int]:
    source = random.Random(seed)
    return lambda: source.randrange(CLASSES)


def scrambled(seed: int) -> Legs:
    """Four legs in a random pure state."""
    legs, draw = Legs(), drawer(seed)
    for _ in range(4):
        legs.zero()
    for _ in range(4):
        for a, b in ((0, 1), (2, 3), (1, 2), (3, 0)):
            legs.gate(draw(), a, b)
    return legs


def test_every_rotated_class_acts_on_groups_as_its_relation_says() -> None:
    for number in range(CLASSES):
        for seed in range(4):
            legs = scrambled(4 * number + seed)
            expected = related(tuple(legs.rows), number)
            legs.rotated(number, 0, 1)
            assert reduced(legs.rows) == expected


@pytest.mark.parametrize("product", [True, False], ids=["product start", "maximally mixed start"])
def test_every_circuit_has_one_entropy_in_both_directions(product: bool) -> None:
    """Entropy of the chain with its purifier = that of the slices 1 .. t of site 0, plus 1 after odd layers."""
    draw, source = drawer(product), random.Random(17)
    for sites in (2, 3, 4, 5, 6, 7, 8, 9):  # also patches narrower than the light cone
        for _ in range(16):
            layers = source.randint(1, 13)
            gates = random_gates(sites, layers, draw)
            bath, columns = Bath(sites, gates, mixed=not product), Columns(sites, layers, gates, product)
            for layer in range(1, layers + 1):
                bath.advance()
                assert bath.entropy() == columns.entropy(layer) + layer % 2
            # every projection acts on a leg that is maximally mixed given all earlier ones: signs do not matter
            assert columns.legs.certain == 0


def test_a_bath_after_an_even_layer_finds_the_qubit_it_gave() -> None:
    gates = random_gates(6, 12, drawer(5))
    bath, entropies = Bath(6, gates, mixed=False), []
    for _ in range(12):
        bath.advance()
        entropies.append(bath.entropy())
    assert entropies[1::2] == entropies[::2]


def test_rotated_gates_project_as_often_as_their_kinds_are_large() -> None:
    """36 classes of products need two projections, 324 like CNOT one, the other 360 (iSWAP, SWAP) are unitary: .05,
    .45, .45 + .05 (Postselection-free entanglement dynamics via spacetime duality, PRL 126, 060501 (2021))."""
    assert np.bincount(rotated_table()[:, 0]).tolist() == [360, 324, 36]
