"""Rows of operations against the same circuits derived in plain Python from the random words."""

from fractions import Fraction
from typing import Any

import numpy as np
import pytest

from support.programs import below, form, gate, hybrid, word_of
from sweepmill_worker.clifford.engine import HybridChain, describe
from sweepmill_worker.program.compile import compile_program
from sweepmill_worker.program.listing import operations
from sweepmill_worker.program.rates import power_law
from sweepmill_worker.program.rotation import rotated_table
from sweepmill_worker.words import words

KEY = (0x12345678, 0x9ABCDEF0)
K = 2**32 + 17
ALL = list(range(720))


def rows_of(circuit: dict[str, Any], k: int = K) -> list[list[list[int]]]:
    return [layer.rows.tolist() for layer in operations(compile_program(circuit), KEY, k)]


def row(code: int, sites: tuple[int, ...], kind: int, place: int, **more: int) -> list[int]:
    padded = [*sites, *[-1] * (4 - len(sites))]
    values = [more.get(name, 0) for name in ("gate", "frame", "letters", "flags")]
    return [code, len(sites), *padded, *values, kind, place]


@pytest.mark.parametrize(("sites", "periodic"), [(2, True), (7, False), (64, True), (130, True), (600, False)])
def test_the_hybrid_chain_has_the_gates_and_measurements_of_its_own_engine(sites: int, periodic: bool) -> None:
    circuit = hybrid(sites, 11, 0.16, boundary="periodic" if periodic else "open")
    chain = HybridChain(sites, 11, periodic, False, int(0.16 * 2**32))
    layers = list(operations(compile_program(circuit), KEY, K))
    for number, (layer, expected) in enumerate(zip(layers, describe(chain, KEY, K), strict=True), start=1):
        assert (layer.number, layer.word) == (number, number)
        gates, measured = layer.rows[: len(expected.gates)], layer.rows[len(expected.gates) :]
        assert (gates[:, 0] == 0).all()
        assert [tuple(gate) for gate in gates[:, [2, 3, 6]].tolist()] == list(expected.gates)
        assert (measured[:, 0] == 1).all()
        assert measured[:, 2].tolist() == list(expected.measured)


def test_layers_before_and_after_have_words_and_numbers_of_their_own() -> None:
    step = {"measure": "X", "on": "sites", "rate": 0.5}
    circuit = form(9, 3, [[step]], before=[[step], [step]], after=[[step]])
    layers = list(operations(compile_program(circuit), KEY, K))
    assert [(layer.number, layer.word) for layer in layers] == [
        (-1, 2**32 - 2),
        (0, 2**32 - 1),
        *((n, n) for n in (1, 2, 3, 4)),
    ]
    for layer in layers:
        chosen = [site for site in range(9) if below(word_of(KEY, layer.word, K)(1, site), 0.5)]
        assert layer.rows.tolist() == [row(1, (s,), 96, s, letters=1, flags=1) for s in chosen]


def test_a_gate_with_a_rate_takes_its_class_from_a_word_of_its_own() -> None:
    circuit = form(6, 40, [[{"apply": "uniform-clifford", "on": "bonds", "rate": 0.3}]], boundary="open")
    for number, rows in enumerate(rows_of(circuit), start=1):
        word, expected = word_of(KEY, number, K), []
        for place in range(5):
            if below(word(1, place), 0.3):
                number_, frame = gate(word(48, place), ALL, 2)
                expected.append(row(0, (place, place + 1), 96, place, gate=number_, frame=frame))
        assert rows == expected


def test_a_choice_takes_one_branch_a_place_and_runs_its_steps_in_order() -> None:
    inner = {
        "choose": [
            {"weight": 1, "steps": [{"measure": "Z"}]},
            {"weight": 3, "steps": [{"apply": "h"}, {"measure": "Y", "recorded": False}]},
            {"weight": 1, "steps": []},
        ]
    }
    outer = {"choose": [{"weight": 0.5, "steps": [inner, {"apply": "s"}]}, {"weight": 1, "steps": []}], "on": "sites"}
    circuit = form(5, 60, [[{"depolarise": True, "on": "sites", "rate": 0.1}, outer]])
    for number, rows in enumerate(rows_of(circuit), start=1):
        word, expected = word_of(KEY, number, K), []
        expected += [row(2, (s,), 96, s) for s in range(5) if below(word(1, s), 0.1)]
        for site in range(5):
            if (word(2, site) * (2**29 + 2**30)) >> 32 >= 2**29:
                continue
            weights = [2**30 // 3, 2**30, 2**30 // 3]
            pick = (word(3, site) * sum(weights)) >> 32
            if pick < weights[0]:
                expected.append(row(1, (site,), 96 + 3, site, letters=3, flags=1))
            elif pick < weights[0] + weights[1]:
                expected.append(row(0, (site,), 96 + 4, site, gate=0))
                expected.append(row(1, (site,), 96 + 5, site, letters=2))
            expected.append(row(0, (site,), 96 + 6, site, gate=4, frame=0))
        assert rows == expected


@pytest.mark.parametrize("fixed", ["trajectory", "ensemble"])
def test_fixed_gates_are_drawn_once(fixed: str) -> None:
    measure = {"measure": "Z", "on": "sites", "rate": 0.2}
    floquet = {"apply": "uniform-clifford", "on": "bonds-from-1", "fixed": fixed}
    circuit = form(8, 7, [[measure], [measure, floquet]], before=[[]])
    for k in (0, K):
        word = word_of(KEY, 2**31 + 2, k if fixed == "trajectory" else 2**64 - 1)
        expected = [gate(word(2, place), ALL, 2) for place in range(4)]
        for number, rows in enumerate(rows_of(circuit, k)[1:], start=1):
            found = [(r[6], r[7]) for r in rows if r[0] == 0]
            assert found == (expected if number % 2 == 0 else [])


def test_rates_follow_profiles_by_site_and_by_layer() -> None:
    by_site = {"profile": "list", "by": "site", "values": [0.2, 1, 0]}
    by_layer = {"profile": "stripe", "by": "layer", "period": 3, "width": 1, "inside": 0.9, "outside": 0.1}
    waves = {
        "profile": "quasi-periodic", "by": "site", "mean": 0.5, "amplitude": 0.5, "wavelength": 1.618, "phase": 0.25
    }  # fmt: skip
    steps = [{"measure": "Z", "on": "sites", "rate": rate} for rate in (by_site, by_layer, waves)]
    for number, rows in enumerate(rows_of(form(7, 20, [steps])), start=1):
        word, expected = word_of(KEY, number, K), []
        levels = [0.5 + 0.5 * np.cos(2 * np.pi * (site / 1.618 + 0.25)) for site in range(7)]
        chosen = [
            [(0.2, 1, 0)[site % 3] for site in range(7)],
            [0.9 if number % 3 < 1 else 0.1] * 7,
            levels,
        ]
        for slot, rates in enumerate(chosen):
            happened = [s for s in range(7) if below(word(1 + slot, s), rates[s])]
            expected += [row(1, (s,), 96 + slot, s, letters=3, flags=1) for s in happened]
        assert rows == expected


def test_quenched_disorder_is_drawn_once_a_trajectory() -> None:
    laws = [
        {"disorder": "uniform", "from": 0.25, "to": 0.75},
        {"disorder": "two-valued", "values": [0.1, 0.9], "weight": 0.3},
        {"disorder": "power-law", "exponent": -0.5, "largest": 0.8},
    ]
    steps = [{"measure": "Z", "on": "sites", "rate": law} for law in laws]
    word0 = word_of(KEY, 0, K)
    curve = power_law(Fraction(-1, 2), int(Fraction(4, 5) * 2**32))
    levels = [
        [2**30 + ((2**31 * word0(192, s)) >> 32) for s in range(6)],
        [int(np.floor((0.1 if below(word0(193, s), 0.3) else 0.9) * 2**32)) for s in range(6)],
        [interpolated(curve.tolist(), word0(194, s) + 1) for s in range(6)],
    ]
    for number, rows in enumerate(rows_of(form(6, 30, [steps])), start=1):
        word, expected = word_of(KEY, number, K), []
        for slot in range(3):
            happened = [s for s in range(6) if word(1 + slot, s) < levels[slot][s]]
            expected += [row(1, (s,), 96 + slot, s, letters=3, flags=1) for s in happened]
        assert rows == expected


def interpolated(curve: list[int], argument: int) -> int:
    """Nodes: 0 .. 255, then 256 to each octave."""
    octave = max(argument.bit_length() - 9, 0)
    node, rest = 256 * octave + (argument >> octave), argument % 2**octave
    return int(curve[node] + (((curve[min(node + 1, len(curve) - 1)] - curve[node]) * rest) >> octave))


def test_rotated_gates_come_as_projections_and_a_gate() -> None:
    circuit = form(8, 12, [[{"apply": "uniform-clifford", "on": "bonds-from-0", "rotated": True}]])
    for number, rows in enumerate(rows_of(circuit), start=1):
        word, expected = word_of(KEY, number, K), []
        for place in range(4):
            sites = (2 * place, 2 * place + 1)
            number_, frame = gate(word(1, place), ALL, 2)
            count, first, second, after = rotated_table()[number_].tolist()
            for ordinal, letters in enumerate([first, second][:count]):
                expected.append(row(1, sites, 96, 3 * place + ordinal, letters=letters, flags=3))
            expected.append(row(0, sites, 96, place, gate=after, frame=frame))
        assert rows == expected


def test_swapped_in_references_are_fresh_ones() -> None:
    swap = {"swap_in": "reference", "on": {"places": [[0], [3]]}}
    again = {"swap_in": "reference", "on": {"places": [[5]]}}
    program = compile_program(form(6, 1, [[]], before=[[swap], [again]]))
    assert (program.sites, program.references, program.total, program.mixed) == (6, 3, 9, False)
    first, second, third = operations(program, KEY, K)
    assert first.rows.tolist() == [
        [*row(4, (0,), 96, 0)[:3], 6, *row(4, (0,), 96, 0)[4:]],
        [4, 1, 3, 7, *second_tail(1)],
    ]
    assert second.rows.tolist() == [[4, 1, 5, 8, *second_tail(0)]]
    assert third.rows.tolist() == []


def second_tail(place: int) -> list[int]:
    return [-1, -1, 0, 0, 0, 0, 96, place]


def test_places_one_after_another_come_from_a_stream_of_words() -> None:
    step = {"apply": "uniform-clifford", "on": {"random_sequential": {"count": 150, "of": "bonds"}}}
    for number, rows in enumerate(rows_of(form(9, 2, [[{"reset": True, "on": "sites", "rate": 0.5}, step]])), start=1):
        stream = words(KEY, 144 + 1, number, K, 150).tolist()
        expected = [(left := (word * 9) >> 32, (left + 1) % 9) for word in stream]
        assert [(r[2], r[3]) for r in rows if r[0] == 0] == expected
        gates = [gate(word, ALL, 2) for word in words(KEY, 2, number, K, 150).tolist()]
        assert [(r[6], r[7]) for r in rows if r[0] == 0] == gates
