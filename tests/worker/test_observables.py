"""From observations to probes and back: equal ways to one number, and numbers known from outside."""

from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray

from sweepmill.coordinates import coordinates
from sweepmill.ensemble import Ensemble
from sweepmill.observation import observation_from_normal_form
from sweepmill.statistics import summarize
from sweepmill_worker.observables.plan import plan_probes
from sweepmill_worker.observables.probes import arc_of
from sweepmill_worker.sample import sample


def ensemble(**changes: Any) -> Ensemble:
    return Ensemble.of("hybrid-clifford", **{"sites": 8, "measurement_rate": 0.2, "layers": 9} | changes)


def means(of: Ensemble, count: int = 20, **fields: Any) -> NDArray[np.float64]:
    """One mean per coordinate."""
    item = observation_from_normal_form({"revision": 1, **fields})
    total = sample(of, [item], 0, count).accumulators[item.key]
    return np.array([row.mean for row in summarize(total, coordinates(of, item))])


def raw(of: Ensemble, count: int = 20, **fields: Any) -> list[int]:
    item = observation_from_normal_form({"revision": 1, **fields})
    sums: list[int] = sample(of, [item], 0, count).accumulators[item.key].sums[:, 0].tolist()
    return sums


@pytest.mark.parametrize("initial_state", ["zeros", "mixed"])
def test_averages_over_translations_do_not_depend_on_how_they_are_read(initial_state: str) -> None:
    ring = ensemble(initial_state=initial_state)
    averaged: dict[str, Any] = {"quantity": "entropy", "average_translations": True}
    cuts = raw(ring, **averaged, region="every-cut")
    assert raw(ring, **averaged, region="every-cut", histogram=True) == cuts
    assert raw(ring, **averaged, region="every-interval")[:-1] == cuts
    assert raw(ring, **averaged, region="half") == [cuts[3]]
    assert raw(ring, **averaged, region=[6, 7, 0]) == [cuts[2]]


def test_negativity_of_a_pure_state_is_the_entropy() -> None:
    for region in ("half", "every-cut", [1, 4, 6]):
        assert raw(ensemble(), quantity="negativity", region=region) == raw(
            ensemble(), quantity="entropy", region=region
        )


def test_a_maximally_mixed_chain_has_no_negativity_and_a_purifier_that_knows_every_site() -> None:
    mixed = ensemble(initial_state="mixed", measurement_rate=0)
    assert means(mixed, 3, quantity="negativity", region="every-cut").tolist() == [0] * 7
    assert means(mixed, 3, quantity="site-environment-information").tolist() == [2, 2]
    assert means(mixed, 3, quantity="generator-lengths").tolist() == [0] * 8
    assert means(mixed, 3, quantity="entropy", region="every-interval").tolist() == list(range(1, 9))


def test_a_product_state_has_generators_of_one_site_that_nobody_else_knows() -> None:
    product = ensemble(measurement_rate=1)
    assert means(product, 3, quantity="generator-lengths").tolist() == [8] + [0] * 7
    assert means(product, 3, quantity="site-environment-information").tolist() == [0, 0]


def test_generators_of_a_pure_chain_cross_its_cuts_twice_for_each_bit() -> None:
    """Clipped gauge: Physical Review X 7, 031016 (2017)."""
    chain = ensemble(sites=11, boundary="open", measurement_rate=0.1)
    counts = raw(chain, quantity="generator-lengths", at="end")
    entropies = raw(chain, quantity="entropy", region="every-cut", at="end")
    assert sum(counts) == 20 * 11
    assert sum((length - 1) * count for length, count in enumerate(counts, start=1)) == 2 * sum(entropies)


def test_shared_probes_are_read_once() -> None:
    items = [
        observation_from_normal_form({"revision": 1, **fields})
        for fields in (
            {"quantity": "entropy"},
            {"quantity": "entropy", "region": [0, 1, 2, 3], "at": "end"},
            {"quantity": "entropy", "region": "every-cut"},
            {"quantity": "negativity"},
            {"quantity": "negativity", "at": "end"},
            {"quantity": "site-environment-information"},
            {"quantity": "site-environment-information", "region": [0, 1, 2, 3]},
        )
    ]
    plan = plan_probes(8, 0, True, tuple(items))
    assert len(plan.probes.arcs) == 7
    assert len(plan.probes.negativities) == len(plan.probes.informations) == 1
    assert plan.probes.size == 7 + 1 + 2


def test_arcs_are_recognized_wherever_they_begin() -> None:
    assert arc_of((2, 3, 4), 8) == (2, 3)
    assert arc_of((0, 1, 6, 7), 8) == (6, 4)
    assert arc_of((0, 7), 8) == (7, 2)
    assert arc_of((), 8) == (0, 0)
    assert arc_of((0, 2, 7), 8) is None
    assert arc_of((1, 7), 8) is None
    assert arc_of((6, 7, 8), 8) is None  # 8 is a reference qubit


def test_all_cuts_of_all_translations_of_a_long_ring_are_few_numbers_and_every_arc_is_one() -> None:
    fields: dict[str, Any] = {"quantity": "entropy", "region": "every-cut", "average_translations": True, "revision": 1}
    averaged, each = (
        plan_probes(128, 0, True, (observation_from_normal_form(fields | more),)) for more in ({}, {"histogram": True})
    )
    assert averaged.probes.size == 128
    assert each.probes.size == 127 * 128
    (indices,) = each.indices
    assert indices is not None
    np.testing.assert_array_equal(np.sort(indices.ravel()), np.arange(127 * 128))
