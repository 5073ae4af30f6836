"""The models of all quantities: keys, labels, coordinates and refusals."""

from typing import Any

import numpy as np
import pytest

from support.specs import small
from sweepmill.coordinates import accumulator_bytes, coordinates
from sweepmill.ensemble import Ensemble
from sweepmill.errors import SpecificationError
from sweepmill.observation import Observation, observation_from_normal_form
from sweepmill.observation.distances import distances
from sweepmill.sweep import Sweep

RING = Ensemble.of("hybrid-clifford", sites=8, measurement_rate=0.1, layers=6)
LINE = Ensemble.of("hybrid-clifford", sites=8, measurement_rate=0.1, layers=6, boundary="open")


def observed(**fields: Any) -> Observation:
    return Sweep.parse(small(observe=[fields])).observations[0].observation


def positions(ensemble: Ensemble, **fields: Any) -> list[int | None]:
    return [place.position for place in coordinates(ensemble, observed(**fields))]


def scales(ensemble: Ensemble, **fields: Any) -> list[int]:
    return [place.scale for place in coordinates(ensemble, observed(**fields))]


@pytest.mark.parametrize(
    ("fields", "label"),
    [
        ({"quantity": "entropy", "region": "every-interval"}, "every-interval"),
        ({"quantity": "site-environment-information", "region": [0, 1, 2, 5]}, "0-2,5"),
        ({"quantity": "negativity"}, "half"),
        ({"quantity": "generator-lengths"}, "all"),
        ({"quantity": "cross-entropy", "against": "plus"}, "against plus"),
    ],
)
def test_an_observation_survives_its_normal_form(fields: dict[str, Any], label: str) -> None:
    item = observed(**fields)
    again = observation_from_normal_form(item.normal_form())
    assert again == item
    assert again.key == item.key
    assert item.region_label() == label


def test_intervals_have_a_position_for_each_length_and_a_window_for_each_place() -> None:
    fields = {"quantity": "entropy", "region": "every-interval", "at": "end"}
    assert positions(LINE, **fields) == [1, 2, 3, 4, 5, 6, 7, 8]
    assert scales(LINE, **fields) == [8, 7, 6, 5, 4, 3, 2, 1]
    assert scales(RING, **fields, average_translations=True) == [8] * 8
    assert scales(RING, **{**fields, "at": "last-cell"}, average_translations=True) == [16] * 8


def test_site_environment_information_is_a_function_of_the_distance() -> None:
    fields = {"quantity": "site-environment-information", "at": "end"}
    assert positions(RING, **fields) == [1, 2]
    assert scales(RING, **fields) == [2, 2]
    assert positions(LINE, **fields) == [1, 2, 3, 4]
    assert scales(LINE, **fields) == [1, 1, 1, 1]
    assert positions(LINE, **fields, region=[1, 2, 3, 6]) == [1, 2]
    assert scales(LINE, **fields, region=[1, 2, 3, 6]) == [3, 1]


def test_lengths_and_cuts_are_positions() -> None:
    assert positions(RING, quantity="generator-lengths", at="end") == list(range(1, 9))
    assert positions(RING, quantity="negativity", region="every-cut", at="end") == list(range(1, 8))


@pytest.mark.parametrize(("periodic", "sites", "size"), [(True, 9, 4), (False, 9, 4), (True, 12, 11), (False, 5, 1)])
def test_distances_are_those_of_the_nearest_site_outside(periodic: bool, sites: int, size: int) -> None:
    draw = np.random.default_rng(sites)
    for _ in range(30):
        region = tuple(sorted(draw.choice(sites, size, replace=False).tolist()))
        outside = set(range(sites)) - set(region)
        ring = [abs(x - y) for x in region for y in outside]
        ways = [min(d, sites - d) if periodic else d for d in ring]
        expected = np.array(ways).reshape(size, -1).min(axis=1)
        np.testing.assert_array_equal(distances(region, sites, periodic), expected)


@pytest.mark.parametrize(
    ("fields", "path", "message"),
    [
        ({"quantity": "entropy", "region": "every-interval", "histogram": True}, "histogram", "has no histogram"),
        ({"quantity": "reference-entropy"}, "quantity", "no reference qubits"),
        ({"quantity": "cluster-order"}, "quantity", "belongs to projective-ising"),
        ({"quantity": "pauli-expectation", "pauli": "Z", "sites": [0]}, "quantity", 'engine = "reference"'),
        ({"quantity": "cross-entropy", "against": "zeros"}, "against", "two different initial states are compared"),
        ({"quantity": "negativity", "region": [3, 12]}, "region", "site 12 is outside"),
        ({"quantity": "site-environment-information", "region": list(range(8))}, "region", "leave a site outside"),
    ],
)
def test_what_an_ensemble_does_not_have_is_refused_by_field(fields: dict[str, Any], path: str, message: str) -> None:
    with pytest.raises(SpecificationError) as error:
        Sweep.parse(small(observe=[fields]))
    (fault, *_) = error.value.faults
    assert fault.path == f"observe[0].{path}"
    assert message in fault.message


def test_clusters_give_what_a_state_has_and_their_own_order_besides() -> None:
    clusters = Ensemble("projective-ising", {**LINE.parameters, "engine": "auto"}, 1)
    signed = Ensemble("projective-ising", {**LINE.parameters, "engine": "reference"}, 1)
    lengths = observed(quantity="generator-lengths")
    assert observed(quantity="entropy", region="every-interval").fault(clusters) is None
    assert lengths.fault(signed) is None
    assert lengths.fault(clusters) is None
    order = observation_from_normal_form({"quantity": "cluster-order", "revision": 1})
    assert order.fault(clusters) is None
    assert order.fault(signed) is not None
    assert [place.scale for place in coordinates(clusters, order)] == [2 * 64]


def test_the_factors_of_a_pauli_product_have_one_spelling() -> None:
    signed = Ensemble("hybrid-clifford", {**LINE.parameters, "engine": "reference"}, 1)
    form = {"quantity": "pauli-expectation", "revision": 1}
    first = observation_from_normal_form({**form, "pauli": "ZXY", "sites": [5, 0, 2]})
    second = observation_from_normal_form({**form, "pauli": "XYZ", "sites": [0, 2, 5]})
    assert first.key == second.key
    assert first.region_label() == "X0 Y2 Z5"
    assert first.fault(signed) is None
    for pauli, sites, path in (("ZZ", [1], "pauli"), ("ZZ", [1, 1], "sites"), ("Z", [8], "sites")):
        fault = observation_from_normal_form({**form, "pauli": pauli, "sites": sites}).fault(signed)
        assert fault is not None
        assert fault[0] == path


def test_the_size_of_a_total_counts_its_coordinates() -> None:
    sizes = [
        accumulator_bytes(RING, observed(quantity="entropy", region=region)) for region in ("half", "every-interval")
    ]
    assert sizes[1] > 5 * sizes[0]


def test_translations_are_those_of_a_ring() -> None:
    averaged = observed(quantity="entropy", average_translations=True)
    lattice = Ensemble.of("hybrid-clifford-square", width=4, height=4, measurement_rate=0.1, layers=8)
    assert averaged.fault(RING) is None
    for ensemble, message in ((LINE, "this one is open"), (lattice, "this is a lattice")):
        field, found = averaged.fault(ensemble) or ("", "")
        assert field == "average_translations"
        assert message in found
    for quantity in ("generator-lengths", "site-environment-information"):
        assert observed(quantity=quantity).fault(RING) is None
        assert observed(quantity=quantity).fault(lattice) is not None


def test_reference_entropy_needs_reference_qubits_and_has_as_many_values_as_they_allow() -> None:
    item = observation_from_normal_form({"quantity": "reference-entropy", "revision": 1, "histogram": True})
    few, many = (
        Ensemble.of("hybrid-clifford", sites=8, measurement_rate=0.1, layers=6, references=references)
        for references in (1, 8)
    )
    assert item.fault(few) is None
    assert item.fault(RING) == ("quantity", "the ensemble has no reference qubits")
    assert item.region_label() == "references"
    assert accumulator_bytes(few, item) < accumulator_bytes(many, item)


def test_records_are_compared_where_signs_or_random_outcomes_tell_them_apart() -> None:
    item = observation_from_normal_form({"quantity": "cross-entropy", "revision": 1, "against": "plus", "at": "end"})
    mixed = Ensemble.of("hybrid-clifford", sites=8, measurement_rate=0.1, layers=6, initial_state="mixed")
    signed = Ensemble.of("hybrid-clifford", sites=8, measurement_rate=0.1, layers=6, engine="reference")
    gates = [{"apply": "uniform-clifford", "on": "bonds"}]
    measured = [[{"choose": [{"weight": 1, "steps": [{"measure": "Z"}]}], "on": "sites"}]]
    dephased = [[{"measure": "Z", "on": "sites", "recorded": False}]]
    begun = {"sites": 8, "layers": 6, "repeat": [gates]}
    for ensemble in (RING, mixed, signed, Ensemble.of("layered", **begun, before=dephased)):
        assert item.fault(ensemble) is None
    assert item.fault(Ensemble.of("layered", **begun, before=measured, engine="reference")) is None
    fault = item.fault(Ensemble.of("layered", **begun, before=measured))
    assert fault is not None
    assert "the record begins in `before`" in fault[1]
    assert [place.scale for place in coordinates(signed, item)] == [1]
    assert [place.scale for place in coordinates(RING, item)] == [2**30]
