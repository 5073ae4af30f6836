"""Gates read sideways: their action on groups, the edge bath they are the other side of, the family of random columns.

Statistical tests share the budget ``rotated``: half of it for windows, half for the kinds of gates.
"""

import random
from collections.abc import Callable

import numpy as np
import pytest

from support.budget import chi_square_limit, z_limit
from support.purity import emitted, purities
from support.sampled import deviations, sampled
from support.sideways import Bath, Columns, Legs, letter_bits, random_gates, related
from support.stabilizer_enumeration import reduced
from sweepmill.ensemble import Ensemble
from sweepmill.presets import layered_form
from sweepmill_worker.program import operations as op
from sweepmill_worker.program.compile import compile_program
from sweepmill_worker.program.listing import operations
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


@pytest.mark.parametrize(("sites", "layers"), [(3, 9), (6, 11), (12, 12)])
def test_sampled_edge_baths_have_the_entropies_of_their_columns(sites: int, layers: int) -> None:
    ensemble = Ensemble.of("edge-bath", sites=sites, layers=layers)
    found = sampled(ensemble, 12, range(1, layers + 1), [tuple(range(sites))]).entropies[:, :, 0]
    for k in range(12):
        gates = {}
        for layer in operations(compile_program(layered_form(ensemble)), ensemble.key_words, k):
            for row in layer.rows[layer.rows[:, op.CODE] == op.GATE]:
                gates[layer.number, int(row[op.SITE])] = int(row[op.CLASS])
        columns = Columns(sites, layers, gates, product=True)
        assert found[k].tolist() == [columns.entropy(layer) + layer % 2 for layer in range(1, layers + 1)]


def test_a_bath_after_an_even_layer_finds_the_qubit_it_gave() -> None:
    gates = random_gates(6, 12, drawer(5))
    bath, entropies = Bath(6, gates, mixed=False), []
    for _ in range(12):
        bath.advance()
        entropies.append(bath.entropy())
    assert entropies[1::2] == entropies[::2]


# Kinds of gates by their number of projections: 360 classes (iSWAP, SWAP) with none, 324 (CNOT) with one, 36
# (products) with two (Postselection-free entanglement dynamics via spacetime duality, PRL 126, 060501 (2021)).
PROJECTIONS = [360, 324, 36]


def test_rotated_classes_project_as_often_as_their_kinds_are_large() -> None:
    assert np.bincount(rotated_table()[:, 0]).tolist() == PROJECTIONS


def columns_of(ends: str, sites: int, layers: int, **more: int) -> Ensemble:
    return Ensemble.of("rotated-clifford", sites=sites, layers=layers, ends=ends, **more)


def test_gates_of_sampled_columns_are_of_all_kinds_in_proportion() -> None:
    ensemble = columns_of("open", 40, 30)
    found = np.zeros(3, dtype=np.int64)
    for k in range(20):
        for layer in operations(compile_program(layered_form(ensemble)), ensemble.key_words, k):
            if layer.number > 0:
                forced = layer.rows[layer.rows[:, op.FLAGS] == op.RECORDED | op.FORCED]
                gates = (layer.rows[:, op.CODE] == op.GATE).sum()
                per_gate = np.unique(forced[:, op.PLACE] // 3, return_counts=True)[1]
                found += [gates - len(per_gate), *np.bincount(per_gate, minlength=3)[1:]]
    expected = found.sum() * np.array(PROJECTIONS) / CLASSES
    assert found.sum() == 20 * 15 * (19 + 20)
    assert ((found - expected) ** 2 / expected).sum() < chi_square_limit("rotated", 2, 2)


@pytest.mark.parametrize("ends", ["open", "product"])
def test_the_executor_follows_columns_as_plain_python_does(ends: str) -> None:
    regions = [tuple(range(a, b)) for a in range(8) for b in range(a + 1, 9)]
    for layers in (1, 2, 5):
        ensemble = columns_of(ends, 8, layers)
        found = sampled(ensemble, 25, [layers], regions).entropies[:, 0]
        for k in range(25):
            legs, slices = play(ensemble, k)
            assert found[k].tolist() == [legs.entropy([slices[m] for m in region]) for region in regions]
            assert legs.certain == 0


def play(ensemble: Ensemble, k: int) -> tuple[Legs, list[int]]:
    """A trajectory's rows on a pure state of many legs; what is traced out stays as a leg."""
    legs = Legs()
    slices = [legs.zero() for _ in range(ensemble.sites)]
    for layer in operations(compile_program(layered_form(ensemble)), ensemble.key_words, k):
        for row in layer.rows:
            sites = row[op.SITE : op.SITE + row[op.SITES]].tolist()
            at = [slices[site] for site in sites]
            if row[op.CODE] == op.GATE and len(sites) == 2:
                legs.gate(int(row[op.CLASS]), *at)
            elif row[op.CODE] == op.GATE:
                legs.single(op.ONE_SITE_CLASSES[row[op.CLASS]], *at)
            elif row[op.CODE] == op.MEASURE:
                letters = [int(row[op.LETTERS]) >> 2 * i & 3 for i in reversed(range(len(sites)))]
                legs.project(sum(letter_bits(letter) << 2 * leg for letter, leg in zip(letters, at, strict=True)))
            else:
                slices[sites[0]] = legs.zero() if row[op.CODE] == op.RESET else legs.pair()[0]
    return legs, slices


def steady(first: int, last: int) -> float:
    """Average purity of the slices first .. last deep in a long patch.

    A window of what the bath takes and keeps holds these slices, and half of a pair more where it begins with an even
    layer or ends with an odd one.
    """
    sites = 2 * (last - first) + 6
    layer = 2 - first % 2  # only its parity matters
    window = emitted(sites, layer, layer + last - first, before=0.5 ** np.arange(sites + 1.0))
    return float(window * 2 ** ((first + 1) % 2 + last % 2))


def test_the_steady_windows_have_the_derived_digits() -> None:
    odd = [steady(1, last) for last in (1, 3, 5, 7, 9, 11)]
    assert odd == pytest.approx([0.5, 0.2, 0.092, 0.04544, 0.023456, 0.012482048], abs=1e-12)


def test_windows_have_their_average_purity_once_there_are_columns_for_them() -> None:
    """Open ends: half as many columns as slices; product ends, from the bottom: as many as the last slice."""
    z = []
    for layers in (1, 2, 4):
        windows = [(a, b) for a in range(8) for b in range(a, 8) if max(1, (b - a + 1) // 2) <= layers]
        windows = [(a, b) for a, b in windows if b - a + 1 <= 2 * layers + 1]
        regions = [tuple(range(a, b + 1)) for a, b in windows]
        found = 2.0 ** -sampled(columns_of("open", 8, layers), 30_000, [layers], regions).entropies[:, 0]
        z.append(deviations(found, np.array([steady(a, b) for a, b in windows])))
    windows = [(a, b) for a in range(1, 8) for b in range(a, 8)]
    regions = [tuple(range(a, b + 1)) for a, b in windows]
    found = 2.0 ** -sampled(columns_of("product", 8, 8), 30_000, [8], regions).entropies[:, 0]
    exact = [emitted(10, a, b) * 2 ** ((a + 1) % 2 + b % 2) for a, b in windows]
    assert [2 * purities(10, b, bath=1)[0, 10] for b in (1, 3, 5)] == pytest.approx([0.8, 0.416, 0.23168])
    z.append(deviations(found, np.array(exact)))
    everything = np.concatenate(z)
    assert np.abs(everything).max() < z_limit("rotated", 2 * len(everything))
