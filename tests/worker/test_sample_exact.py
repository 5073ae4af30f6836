"""The whole path of `sample`, accumulators and statistics against exact averages of four sites.

Exact values: Markov chain on all 2,295 stabilizer groups of four sites, periodic, p = 0.16 (and, for purification, on
all isotropic subspaces); the same enumeration is done again in ``support.stabilizer_enumeration`` and its digits are
tested in ``test_exact_chains``. False-alarm probability: the share ``sample`` of the suite's budget.
"""

from typing import Any

import numpy as np
import pytest

from support.budget import z_limit
from support.specs import small
from sweepmill.accumulate import Accumulator
from sweepmill.coordinates import coordinates
from sweepmill.ensemble import Ensemble
from sweepmill.observation import Observation
from sweepmill.statistics import Moments, summarize
from sweepmill.sweep import Sweep
from sweepmill_worker.sample import sample

COUNT = 60_000
COMPARISONS = 21  # z-scores in this file
LAYERS = [1, 2, 4]
ENTROPY = [0.0, 0.718846198397, 0.771706987861]
VARIANCE = [0.0, 0.420668976022, 0.417241027025]
PURITY = [1.0, 0.667897230123, 0.644279720354]
SITE_ENTROPY = [0.282240000000, 0.448813479794, 0.505176403063]
TRIPARTITE = [0.0, -0.059900305136, -0.084238567658]
RANDOMNESS = [0.789333333333, 0.857572115871, 0.880618515075]
GLOBAL_ENTROPY = [3.36, 2.836850688, 2.101621828649]
RANDOM_OUTCOMES = [0.64, 1.264162133, 2.492741844]


def sampled(observe: list[dict[str, Any]], **changes: Any) -> dict[str, tuple[Accumulator, list[Moments]]]:
    spec = small(circuit__sites=4, circuit__measurement_rate=0.16, circuit__layers=4, observe=observe)
    spec["circuit"] |= changes
    sweep = Sweep.parse(spec)
    ensemble: Ensemble = sweep.points[0].ensemble
    named: dict[str, Observation] = {item.name: item.observation for item in sweep.observations}
    totals = sample(ensemble, list(named.values()), 0, COUNT).accumulators
    return {
        name: (totals[item.key], summarize(totals[item.key], coordinates(ensemble, item)))
        for name, item in named.items()
    }


def agree(moments: list[Moments], exact: list[float]) -> None:
    for one, value in zip(moments, exact, strict=True):
        assert abs(one.mean - value) < z_limit("sample", COMPARISONS) * one.standard_error


def test_means_variances_and_outcome_randomness_are_the_exact_ones() -> None:
    found = sampled(
        [
            {"quantity": "entropy", "at": LAYERS},
            {"quantity": "entropy", "name": "site", "region": [0], "at": LAYERS},
            {"quantity": "tripartite-information", "at": LAYERS},
            {"quantity": "outcome-randomness", "at": LAYERS},
        ]
    )
    agree(found["entropy"][1], ENTROPY)
    agree(found["site"][1], SITE_ENTROPY)
    agree(found["tripartite-information"][1], TRIPARTITE)
    agree(found["outcome-randomness"][1], RANDOMNESS)
    # a variance of values 0, 1, 2 has a standard error below 0.002 here: six of them, two comparisons
    spread = [moments.variance for moments in found["entropy"][1]]
    assert spread == pytest.approx(VARIANCE, abs=0.012)


def test_the_mean_purity_from_the_histogram_is_the_exact_one() -> None:
    total, _ = sampled([{"quantity": "entropy", "at": LAYERS, "histogram": True}])["entropy"]
    assert total.histogram is not None
    for place, exact in enumerate(PURITY):
        rows = total.histogram[total.histogram[:, 0] == place]
        weights, occurrences = 2.0 ** -rows[:, 1], rows[:, 2:].sum(axis=1)
        mean = weights @ occurrences / COUNT
        error = np.sqrt((weights**2 @ occurrences / COUNT - mean**2) / COUNT)
        assert occurrences.sum() == COUNT
        assert abs(mean - exact) <= z_limit("sample", COMPARISONS) * error


def test_a_mixed_chain_purifies_and_its_record_grows_as_exactly_known() -> None:
    found = sampled(
        [
            {"quantity": "global-entropy", "at": LAYERS},
            {"quantity": "record-bits", "at": LAYERS},
        ],
        initial_state="mixed",
    )
    agree(found["global-entropy"][1], GLOBAL_ENTROPY)
    agree(found["record-bits"][1], RANDOM_OUTCOMES)
