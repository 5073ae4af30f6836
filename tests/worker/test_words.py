"""Random words: the published generator, the layout of its counters, and what is made of the words."""

import numpy as np
import pytest

from support.budget import chi_square_limit
from sweepmill_worker.clifford.engine import HybridChain, describe
from sweepmill_worker.words import GATE, MEASURE, fill, words

# "Parallel random numbers: as easy as 1, 2, 3", SC11 (2011): known answers distributed with its reference code,
# philox4x32, 10 rounds: counter, key, words.
KNOWN_ANSWERS = [
    ((0, 0, 0, 0), (0, 0), (0x6627E8D5, 0xE169C58D, 0xBC57AC4C, 0x9B00DBD8)),
    (
        (0xFFFFFFFF, 0xFFFFFFFF, 0xFFFFFFFF, 0xFFFFFFFF),
        (0xFFFFFFFF, 0xFFFFFFFF),
        (0x408F276D, 0x41C83B0E, 0xA20BC7C6, 0x6D5451FD),
    ),
    (
        (0x243F6A88, 0x85A308D3, 0x13198A2E, 0x03707344),
        (0xA4093822, 0x299F31D0),
        (0xD16CFE09, 0x94FDCCEB, 0x5001E420, 0x24126EA1),
    ),
]


def philox(counter: tuple[int, ...], key: tuple[int, int]) -> tuple[int, ...]:
    """Philox4x32-10 in plain Python, from the paper's definition."""
    c0, c1, c2, c3 = counter
    k0, k1 = key
    for _ in range(10):
        first, second = 0xD2511F53 * c0, 0xCD9E8D57 * c2
        c0, c1, c2, c3 = (
            (second >> 32) ^ c1 ^ k0,
            second & 0xFFFFFFFF,
            (first >> 32) ^ c3 ^ k1,
            first & 0xFFFFFFFF,
        )
        k0, k1 = (k0 + 0x9E3779B9) & 0xFFFFFFFF, (k1 + 0xBB67AE85) & 0xFFFFFFFF
    return c0, c1, c2, c3


@pytest.mark.parametrize(("counter", "key", "expected"), KNOWN_ANSWERS)
def test_the_plain_generator_gives_the_published_answers(
    counter: tuple[int, ...], key: tuple[int, int], expected: tuple[int, ...]
) -> None:
    assert philox(counter, key) == expected


@pytest.mark.parametrize(("counter", "key", "expected"), KNOWN_ANSWERS)
def test_the_compiled_generator_gives_the_published_answers(
    counter: tuple[int, ...], key: tuple[int, int], expected: tuple[int, ...]
) -> None:
    made = np.empty(4, dtype=np.uint32)
    places, layers = np.array([counter[0]], dtype=np.uint32), np.array([counter[1]], dtype=np.uint32)
    fill(made, places, layers, 0, np.uint64(counter[2] | counter[3] << 32), key)
    assert tuple(made.tolist()) == expected


@pytest.mark.parametrize("kind", [GATE, MEASURE, 96])
@pytest.mark.parametrize("k", [0, 5, 2**32 - 1, 2**32, 2**63 + 12345])
def test_the_word_of_a_place_is_a_lane_of_its_block(kind: int, k: int) -> None:
    key, layer = (0x89ABCDEF, 0x01234567), 77
    made = words(key, kind, layer, k, 41)
    for place in range(41):
        block = philox((kind << 24 | place // 4, layer, k & 0xFFFFFFFF, k >> 32), key)
        assert int(made[place]) == block[place % 4]


def test_words_do_not_depend_on_how_many_places_are_asked_for() -> None:
    few, many = (words((1, 2), GATE, 3, 4, places) for places in (5, 50))
    np.testing.assert_array_equal(few, many[:5])


def test_rate_zero_measures_nothing_and_rate_one_everything() -> None:
    for threshold, expected in ((0, ()), (2**32, tuple(range(10)))):
        chain = HybridChain(10, 20, True, False, threshold)
        assert all(layer.measured == expected for layer in describe(chain, (3, 4), 9))


def test_layers_alternate_between_the_two_sets_of_bonds() -> None:
    periodic, opened = (describe(HybridChain(6, 2, p, False, 0), (0, 0), 0) for p in (True, False))
    assert [gate[:2] for gate in periodic[0].gates] == [(0, 1), (2, 3), (4, 5)]
    assert [gate[:2] for gate in periodic[1].gates] == [(1, 2), (3, 4), (5, 0)]
    assert [gate[:2] for gate in opened[1].gates] == [(1, 2), (3, 4)]


def test_gate_classes_and_measurements_have_their_frequencies() -> None:
    layers = [layer for k in range(20) for layer in describe(HybridChain(64, 200, True, False, 2**31), (5, 6), k)]
    classes = np.bincount([gate[2] for layer in layers for gate in layer.gates], minlength=720)
    expected = classes.sum() / 720
    assert ((classes - expected) ** 2 / expected).sum() < chi_square_limit("word-frequencies", 2, 719)
    measured = np.bincount([site for layer in layers for site in layer.measured], minlength=64)
    assert ((measured - 2000) ** 2 / 1000).sum() < chi_square_limit("word-frequencies", 2, 64)
