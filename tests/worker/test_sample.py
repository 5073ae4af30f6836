import pickle
from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from support.specs import small
from sweepmill.accumulate import Accumulator, merged
from sweepmill.coordinates import accumulator_bytes, coordinates
from sweepmill.ensemble import Ensemble
from sweepmill.observation import Observation
from sweepmill.statistics import summarize
from sweepmill.sweep import Sweep
from sweepmill_worker.clifford.engine import HybridChain, run
from sweepmill_worker.sample import sample, sample_plain, trajectory_values

EVERYTHING: list[dict[str, Any]] = [
    {"quantity": "entropy", "average_translations": True, "histogram": True},
    {"quantity": "entropy", "name": "cuts", "region": "every-cut", "at": {"every": 4}},
    {"quantity": "entropy", "name": "sites", "region": [0, 3, 5], "at": [1, 7]},
    {"quantity": "mutual-information", "average_translations": True},
    {"quantity": "tripartite-information", "average_translations": True, "histogram": True},
    {"quantity": "global-entropy", "at": "end"},
    {"quantity": "record-bits", "at": {"log_spaced": 4}, "histogram": True},
    {"quantity": "outcome-randomness", "at": {"average_over": {"last": 0.5}}},
    {"quantity": "outcome-randomness", "name": "so-far", "cumulative": True, "at": [2, 8]},
    {"quantity": "entropy", "name": "intervals", "region": "every-interval", "average_translations": True},
    {"quantity": "site-environment-information", "at": {"every": 8}},
    {"quantity": "negativity", "region": "every-cut", "histogram": True},
    {"quantity": "generator-lengths", "at": "end"},
]


def prepared(**changes: Any) -> tuple[Ensemble, list[Observation]]:
    sweep = Sweep.parse(small(circuit__sites=8, circuit__measurement_rate=0.2, observe=EVERYTHING) | changes)
    return sweep.points[0].ensemble, [item.observation for item in sweep.observations]


def one(ensemble: Ensemble, observation: Observation, count: int, first: int = 0) -> Accumulator:
    return sample(ensemble, [observation], first, count).accumulators[observation.key]


@settings(max_examples=12, deadline=None)
@given(st.lists(st.integers(1, 40), min_size=1, max_size=5), st.sampled_from([0, 17, 2**33]), st.data())
def test_any_split_into_batches_gives_the_same_totals_in_any_order(
    sizes: list[int], start: int, data: st.DataObject
) -> None:
    ensemble, observations = prepared()
    edges = np.cumsum([start, *sizes]).tolist()
    batches = [sample(ensemble, observations, first, size) for first, size in zip(edges[:-1], sizes, strict=True)]
    whole = sample(ensemble, observations, start, sum(sizes))
    for item in observations:
        parts = data.draw(st.permutations([batch.accumulators[item.key] for batch in batches]))
        assert merged(parts).to_bytes() == whole.accumulators[item.key].to_bytes()


def test_observations_do_not_depend_on_what_else_is_observed() -> None:
    ensemble, observations = prepared()
    together = sample(ensemble, observations, 5, 30)
    for item in observations:
        assert one(ensemble, item, 30, first=5) == together.accumulators[item.key]


def test_what_the_pool_runs_takes_and_returns_plain_values() -> None:
    ensemble, observations = prepared()
    forms = [item.normal_form() for item in observations]
    result = sample_plain(ensemble.normal_form(), forms, 3, 20)
    assert pickle.loads(pickle.dumps(result)) == result
    whole = sample(ensemble, observations, 3, 20)
    for item in observations:
        assert result["accumulators"][item.key] == whole.accumulators[item.key].to_bytes()
        assert result["digests"][item.key] == whole.accumulators[item.key].digest
    assert result["seconds"] > 0


def test_replicates_are_other_trajectories_of_the_same_law() -> None:
    ensemble, observations = prepared()
    other = Ensemble.of(ensemble.family, **{**ensemble.parameters, "replicate": 1})
    assert other.key != ensemble.key
    assert one(other, observations[0], 20) != one(ensemble, observations[0], 20)


def test_the_values_of_one_trajectory_are_what_the_accumulator_holds() -> None:
    ensemble, observations = prepared()
    for item, found in zip(observations, trajectory_values(ensemble, observations, 11), strict=True):
        total = one(ensemble, item, 1, first=11)
        places = coordinates(ensemble, item)
        assert found["observation"] == item.normal_form()
        for place, raw, row in zip(places, total.sums.tolist(), found["values"], strict=True):
            assert (row["layer"], row["position"]) == (place.layer, place.position)
            if item.COMPONENTS == 2:
                assert [row["numerator"], row["denominator"]] == raw
            else:
                assert row["value"] == raw[0] / place.scale


def interval(start: int, length: int) -> tuple[int, ...]:
    return tuple(sorted((start + i) % 8 for i in range(length)))


def opposite(start: int, length: int) -> tuple[int, ...]:
    return tuple(sorted(interval(start, length) + interval(start + 4, length)))


class ByHand:
    """Entropies and outcome counts of 25 trajectories straight from the engine, for every layer."""

    def __init__(self, ensemble: Ensemble) -> None:
        chain = HybridChain(8, ensemble.layers, True, False, int(0.2 * 2**32))
        regions = {interval(x, n) for x in range(8) for n in (1, 2, 4, 6)} | {(0, 3, 5)}
        regions |= {opposite(x, n) for x in range(8) for n in (1, 2)}
        self.index = {region: i for i, region in enumerate(sorted(regions))}
        self.counts = run(chain, ensemble.key_words, 0, 25, range(1, ensemble.layers + 1), sorted(regions))
        self.last = slice(ensemble.layers - 2, ensemble.layers)
        self.late = slice(ensemble.layers // 2, None)

    def entropy(self, region: tuple[int, ...], layers: slice) -> int:
        return int(self.counts.entropies[:, layers, self.index[region]].sum())

    def mutual(self) -> int:
        terms = [(1, interval(x, 1)) for x in range(8)] + [(1, interval(x + 4, 1)) for x in range(8)]
        terms += [(-1, opposite(x, 1)) for x in range(8)]
        return sum(sign * self.entropy(region, self.last) for sign, region in terms)

    def tripartite(self) -> int:
        total = 0
        for x in range(8):
            plus = [interval(x, 2), interval(x + 2, 2), interval(x + 4, 2), interval(x, 6)]
            minus = [interval(x, 4), interval(x + 2, 4), opposite(x, 2)]
            total += sum(self.entropy(region, self.last) for region in plus)
            total -= sum(self.entropy(region, self.last) for region in minus)
        return total


def test_quantities_are_their_formulas_of_region_entropies_and_outcome_counts() -> None:
    ensemble, _ = prepared()
    hand = ByHand(ensemble)
    named = {
        item.name: item.observation for item in Sweep.parse(small(circuit__sites=8, observe=EVERYTHING)).observations
    }
    totals = {name: one(ensemble, item, 25).sums.tolist() for name, item in named.items()}
    layer = [slice(n - 1, n) for n in range(ensemble.layers + 1)]
    random, measured, last, late = hand.counts.random, hand.counts.measured, hand.last, hand.late
    assert totals["entropy"] == [[sum(hand.entropy(interval(x, 4), last) for x in range(8))]]
    assert totals["sites"] == [[hand.entropy((0, 3, 5), layer[1])], [hand.entropy((0, 3, 5), layer[7])]]
    assert totals["cuts"][3] == [hand.entropy(interval(0, 4), slice(2, 4))]
    assert totals["tripartite-information"] == [[hand.tripartite()]]
    assert totals["mutual-information"] == [[hand.mutual()]]
    assert totals["global-entropy"] == [[0]]
    assert totals["record-bits"][-1] == [np.cumsum(random, axis=1)[:, last].sum()]
    assert totals["outcome-randomness"] == [[random[:, late].sum(), measured[:, late].sum()]]
    assert totals["so-far"][1] == [random[:, :8].sum(), measured[:, :8].sum()]


def test_the_histogram_holds_single_readings_whose_mean_is_the_mean() -> None:
    ensemble, observations = prepared()
    item = next(o for o in observations if o.quantity == "tripartite-information")
    total = one(ensemble, item, 40)
    assert total.histogram is not None
    occurrences = total.histogram[:, 2:].sum(axis=1)
    assert occurrences.sum() == 40 * 2 * 8  # trajectories, layers of the cell, translations
    assert (total.histogram[:, 1] * occurrences).sum() == total.sums[0, 0]


def test_without_measurements_outcomes_are_undefined_and_with_all_measured_sites_are_product_states() -> None:
    forms = [{"quantity": "outcome-randomness"}, {"quantity": "entropy"}]
    sweep = Sweep.parse(small(circuit__sites=8, circuit__measurement_rate=[0, 1], observe=forms))
    entropy, randomness = (item.observation for item in sweep.observations)
    silent, product = (point.ensemble for point in sweep.points)
    assert np.isnan(summarize(one(silent, randomness, 50), coordinates(silent, randomness))[0].mean)
    assert summarize(one(product, entropy, 50), coordinates(product, entropy))[0].mean == 0


@pytest.mark.parametrize("count", [29, 400])
def test_totals_are_not_larger_than_predicted(count: int) -> None:
    observe = [
        {"quantity": "entropy", "region": "every-cut", "histogram": True},
        {"quantity": "entropy", "name": "series", "at": {"every": 1, "single_layers": True}},
        {"quantity": "tripartite-information", "average_translations": True, "histogram": True},
        {"quantity": "record-bits", "histogram": True, "at": {"every": 2}},
        {"quantity": "outcome-randomness", "at": [1, 5]},
    ]
    sweep = Sweep.parse(small(circuit__sites=64, circuit__measurement_rate=[0.1, 0.4], observe=observe))
    for point in sweep.points:
        observations = [item.observation for item in sweep.observations]
        totals = sample(point.ensemble, observations, 0, count).accumulators
        for item in observations:
            assert totals[item.key].nbytes <= accumulator_bytes(point.ensemble, item)


@pytest.mark.parametrize(("first", "count"), [(-1, 5), (0, 0), (3, -2)])
def test_an_empty_or_negative_range_is_refused(first: int, count: int) -> None:
    ensemble, observations = prepared()
    with pytest.raises(ValueError, match="a batch starts at 0 or later"):
        sample(ensemble, observations, first, count)


def test_an_ensemble_of_another_revision_is_refused() -> None:
    ensemble, observations = prepared()
    old = Ensemble(ensemble.family, ensemble.parameters, ensemble.revision + 1)
    with pytest.raises(ValueError, match="has revision"):
        sample(old, observations, 0, 1)


def test_an_observation_the_ensemble_does_not_have_is_refused_by_field() -> None:
    ensemble, _ = prepared()
    deep = Sweep.parse(small(observe=[{"quantity": "entropy", "at": [16]}])).observations[0].observation
    shallow = Ensemble.of("hybrid-clifford", sites=8, measurement_rate=0.1, layers=4)
    with pytest.raises(ValueError, match=r"entropy\.at: layer 16 is beyond the last layer, 4"):
        sample(shallow, [deep], 0, 1)
    assert one(ensemble, deep, 1).count == 1
