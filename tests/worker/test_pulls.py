"""Error bars are tested like means: over many replicates the pulls must have unit width and no bias.

The exact value is that of the Markov chain on all stabilizer groups of four sites (re-derived in
``support.stabilizer_enumeration`` and tested beside it): periodic chain, p = 0.16, entropy of two neighbouring sites
after the second layer.
"""

from collections.abc import Iterator

import numpy as np
import pytest
from scipy import stats

from support.budget import SHARES, z_limit
from sweepmill.accumulate import Accumulator
from sweepmill.coordinates import coordinates
from sweepmill.ensemble import Ensemble
from sweepmill.observation import Entropy
from sweepmill.statistics import Moments, rule_met, summarize
from sweepmill.stop import StandardErrorRule, Stop
from sweepmill_worker.sample import sample

EXACT = 0.718846198397  # bits
REPLICATES = 200
OBSERVATION = Entropy(quantity="entropy", region="half", at=(2,))
FIXED = Stop(trajectories=400)
# standard deviation 0.65: the rule is met at about N = 600, between rungs that differ by a factor 2^(1/4)
RULE = Stop(trajectories=4000, at_least=200, standard_error=(StandardErrorRule(of="entropy", below=0.0265),))


def ensembles() -> Iterator[Ensemble]:
    for replicate in range(REPLICATES):
        yield Ensemble.of("hybrid-clifford", sites=4, measurement_rate=0.16, layers=2, replicate=replicate)


def settle(ensemble: Ensemble, stop: Stop) -> Accumulator:
    """Sample up the ladder until the rule holds."""
    total, reached = None, 0
    for rung in stop.ladder(stop.trajectories):
        part = sample(ensemble, [OBSERVATION], reached, rung - reached).accumulators[OBSERVATION.key]
        total, reached = (part if total is None else total.merge(part)), rung
        if stop.standard_error and rule_met(total, coordinates(ensemble, OBSERVATION), stop.standard_error[0].below):
            break
    assert total is not None
    return total


def settled(stop: Stop) -> list[tuple[int, Moments]]:
    found = []
    for ensemble in ensembles():
        total = settle(ensemble, stop)
        found.append((total.count, summarize(total, coordinates(ensemble, OBSERVATION))[0]))
    return found


@pytest.mark.parametrize("stop", [FIXED, RULE], ids=["fixed count", "standard-error rule"])
def test_pulls_over_replicates_have_unit_width_and_no_bias(stop: Stop) -> None:
    """False-alarm probability: the share ``pulls``, split over two stopping rules with two comparisons each."""
    pulls = np.array([(moments.mean - EXACT) / moments.standard_error for _, moments in settled(stop)])
    tail = SHARES["pulls"] / 4 / 2
    assert stats.chi2.ppf(tail, REPLICATES) < (pulls**2).sum() < stats.chi2.isf(tail, REPLICATES)
    assert abs(pulls.mean()) * np.sqrt(REPLICATES) < z_limit("pulls", 4)


def test_the_rule_stops_at_rungs_that_differ_between_replicates() -> None:
    counts = {count for count, _ in settled(RULE)}
    assert len(counts) > 1
    assert counts <= set(RULE.ladder(RULE.trajectories))
    assert max(counts) < RULE.trajectories
