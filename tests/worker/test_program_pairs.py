"""Random pairs: disjoint, and distributed as the rule says."""

from collections import Counter
from functools import cache
from typing import Any

import numpy as np
import pytest
from scipy.stats import chi2

from support.programs import form
from sweepmill_worker.program.compile import compile_program
from sweepmill_worker.program.listing import operations
from sweepmill_worker.words import words

KEY = (77, 78)


def pairs_of(sites: int, layers: int, boundary: str, count: int | str, exponent: float) -> list[list[tuple[int, int]]]:
    on = {"random_pairs": {"count": count, "exponent": exponent}}
    circuit = form(sites, layers, [[{"apply": "cz", "on": on}]], boundary=boundary)
    return [[(r[2], r[3]) for r in layer.rows.tolist()] for layer in operations(compile_program(circuit), KEY, 5)]


def test_uniform_pairs_follow_from_the_stream_word_by_word() -> None:
    for number, pairs in enumerate(pairs_of(100, 3, "periodic", "all", 0), start=1):
        stream = iter(words(KEY, 144, number, 5, 100).tolist())
        free, expected = list(range(100)), []
        while free:
            pair = []
            for _ in range(2):
                at = (next(stream) * len(free)) >> 32
                pair.append(free[at])
                free[at] = free[-1]
                free.pop()
            expected.append(tuple(pair))
        assert pairs == expected


@pytest.mark.parametrize("boundary", ["periodic", "open"])
@pytest.mark.parametrize("exponent", [0, 0.5, 2, 12, 64])
def test_pairs_are_disjoint(boundary: str, exponent: float) -> None:
    for pairs in pairs_of(64, 20, boundary, 32, exponent):
        assert sorted(site for pair in pairs for site in pair) == list(range(64))


@pytest.mark.parametrize("boundary", ["periodic", "open"])
@pytest.mark.parametrize(("exponent", "count"), [(0, 2), (1.5, 3), (3, 1), (6, 3)])
def test_matchings_have_the_probabilities_of_the_rule(boundary: str, exponent: float, count: int) -> None:
    """Enumerated exactly for six sites; Pearson's test with a false-alarm probability of 1e-4 per case."""
    sites, samples = 6, 4000

    def distance(a: int, b: int) -> int:
        return min(abs(a - b), sites - abs(a - b)) if boundary == "periodic" else abs(a - b)

    @cache
    def law(free: frozenset[int], left: int) -> dict[frozenset[frozenset[int]], float]:
        if left == 0:
            return {frozenset(): 1.0}
        total: Counter[frozenset[frozenset[int]]] = Counter()
        for a in free:
            weights = {b: distance(a, b) ** -float(exponent) for b in free - {a}}
            for b, weight in weights.items():
                for rest, chance in law(free - {a, b}, left - 1).items():
                    chances = chance * weight / sum(weights.values()) / len(free)
                    total[rest | {frozenset((a, b))}] += chances
        return dict(total)

    expected = law(frozenset(range(sites)), count)
    found = Counter(frozenset(map(frozenset, pairs)) for pairs in pairs_of(sites, samples, boundary, count, exponent))
    assert set(found) <= set(expected)
    likely = [(samples * chance, found[matching]) for matching, chance in expected.items() if samples * chance >= 5]
    rare = [(samples * chance, found[matching]) for matching, chance in expected.items() if samples * chance < 5]
    likely += [tuple(np.sum(rare, axis=0))] if sum(chance for chance, _ in rare) >= 5 else []
    statistic = sum((seen - mean) ** 2 / mean for mean, seen in likely)
    assert statistic < chi2.isf(1e-4, max(len(likely) - 1, 1))


def test_an_exponent_beyond_decimal_arithmetic_is_refused_and_the_largest_still_pairs_everybody() -> None:
    with pytest.raises(ValueError, match="exponents are 0 to 64"):
        compile_program(form_of(1e7))
    program = compile_program(form_of(64))
    for k in range(200):
        (layer,) = operations(program, (1, 2), k)
        assert sorted(layer.rows[:, 2:4].ravel().tolist()) == list(range(8))


def form_of(exponent: float) -> dict[str, Any]:
    step = {"apply": "uniform-clifford", "on": {"random_pairs": {"exponent": exponent}}}
    return {"sites": 8, "layers": 1, "repeat": [[step]]}
