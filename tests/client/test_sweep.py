import json
from pathlib import Path
from typing import Any

import pytest

from support.specs import small, transition
from sweepmill.errors import Fault, SpecificationError
from sweepmill.limits import Limits, check_limits
from sweepmill.sweep import Sweep


def faults(spec: dict[str, Any]) -> dict[str, str]:
    with pytest.raises(SpecificationError) as caught:
        Sweep.parse(spec)
    return {fault.path: fault.message for fault in caught.value.faults}


def test_the_example_expands_into_the_product_of_its_axes() -> None:
    sweep = Sweep.parse(transition())
    assert len(sweep.points) == 21
    assert sweep.axes == ("sites", "measurement_rate")
    first, last = sweep.points[0].ensemble, sweep.points[-1].ensemble
    assert dict(first.parameters) == {
        "sites": 32,
        "measurement_rate": 0.13,
        "boundary": "periodic",
        "initial_state": "zeros",
        "references": 0,
        "scrambling_layers": 0,
        "layers": 128,
        "replicate": 0,
        "engine": "auto",
    }
    assert (last.sites, last.parameters["measurement_rate"], last.layers) == (128, 0.19, 512)
    assert [item.name for item in sweep.observations] == ["entropy", "i3"]


def test_toml_json_and_python_objects_are_the_same_sweep(tmp_path: Path) -> None:
    toml = tmp_path / "a.toml"
    toml.write_text(
        """
        [circuit]
        family = "hybrid-clifford"
        sites = [8, 12]
        measurement_rate = { from = 0.10, to = 0.2, points = 2 }
        layers = { per_site = 2 }
        [[observe]]
        quantity = "entropy"
        [[observe]]
        name = "i3"
        quantity = "tripartite-information"
        [stop]
        trajectories = 300
        """
    )
    plain = tmp_path / "a.json"
    plain.write_text(json.dumps(small()))
    keys = {Sweep.read(toml).key, Sweep.read(plain).key, Sweep.parse(small()).key, Sweep(**small()).key}
    assert len(keys) == 1


def test_a_file_that_cannot_be_parsed_is_one_clear_fault(tmp_path: Path) -> None:
    broken = tmp_path / "broken.toml"
    broken.write_text("[circuit\n")
    with pytest.raises(SpecificationError, match=r"broken\.toml cannot be parsed"):
        Sweep.read(broken)


def test_every_fault_is_listed_with_its_path() -> None:
    spec = transition(
        circuit__sites=[32, "a", 64],
        circuit__measurement_rate=[0.1, True, "0.1"],
        circuit__boundary="ring",
        circuit__phases=1,
        stop__trajectories=0,
        extra=1,
    )
    assert faults(spec) == {
        "circuit.sites[1]": "must be an integer, got 'a'",
        "circuit.measurement_rate[1]": "must be a number, got True",
        "circuit.measurement_rate[2]": "must be a number, got '0.1'",
        "circuit.boundary": "must be 'periodic' or 'open', got 'ring'",
        "circuit.phases": "unknown field",
        "stop.trajectories": "must be greater than or equal to 1, got 0",
        "extra": "unknown field",
    }


def test_faults_between_fields_are_found_although_another_field_has_no_valid_value() -> None:
    found = faults(small(circuit__sites=[8, 7], circuit__measurement_rate=1.5, circuit__layers={"per_site": 0.3}))
    assert sorted(found) == ["circuit.layers", "circuit.measurement_rate", "circuit.sites[1]"]


def test_a_file_that_is_not_text_is_one_clear_fault(tmp_path: Path) -> None:
    broken = tmp_path / "broken.toml"
    broken.write_bytes(bytes([0xFF, 0xFE, 0x00]))
    with pytest.raises(SpecificationError, match=r"broken\.toml cannot be parsed"):
        Sweep.read(broken)


def test_faults_between_fields_name_what_would_pass() -> None:
    found = faults(
        transition(circuit__sites=[32, 33, 64, 64], circuit__measurement_rate=[0.1, 1.5], stop__at_least=5000)
    )
    assert found["circuit.sites[1]"] == "periodic brickwork needs an even number of sites, got 33"
    assert found["circuit.sites[3]"] == "the value 64 stands in this axis already"
    assert found["circuit.measurement_rate[1]"] == "a rate is a probability between 0 and 1, got 1.5"
    assert found["stop.at_least"] == "5000 exceeds the cap of 4000 trajectories"


@pytest.mark.parametrize(
    ("change", "path", "words"),
    [
        ({"circuit__family": "hybrid-clifort"}, "circuit.family", "did you mean 'hybrid-clifford'?"),
        ({"circuit__sites": []}, "circuit.sites", "needs at least one item"),
        ({"circuit__sites": 1}, "circuit.sites", "at least 2"),
        ({"circuit__sites": float("nan")}, "circuit.sites", "must be an integer"),
        ({"circuit__measurement_rate": float("inf")}, "circuit.measurement_rate", "must be a finite number"),
        ({"circuit__measurement_rate": {"from": 0.1, "to": 0.2}}, "circuit.measurement_rate", "'points' or 'step'"),
        ({"circuit__measurement_rate": {"from": 0.2, "to": 0.1, "points": 3}}, "circuit.measurement_rate", "upwards"),
        (
            {"circuit__measurement_rate": {"from": 0.1, "to": 0.2, "step": 0.03}},
            "circuit.measurement_rate",
            "step 0.03 does not lead from 0.1 to 0.2: it stops at 0.19",
        ),
        (
            {"circuit__measurement_rate": {"from": 0.1, "to": 0.2, "step": 1e-9}},
            "circuit.measurement_rate",
            "at most 100000 values",
        ),
        ({"circuit__measurement_rate": 1e-10}, "circuit.measurement_rate", "0 or at least 1e-06"),
        ({"circuit__layers": {"per_site": 0.3}}, "circuit.layers", "must be an integer"),
        ({"circuit__layers": 0}, "circuit.layers", "at least 1"),
        ({"circuit__layers": 2.5}, "circuit.layers", "must be an integer or { per_site = n }"),
        ({"circuit__replicate": -1}, "circuit.replicate", "at least 0"),
        ({"observe": []}, "observe", "needs at least one item"),
        ({"circuit__replicate": 2**53}, "circuit.replicate", "must be an integer below 2^53"),
        ({"circuit__layers": 10**400}, "circuit.layers", "must be an integer"),
        ({"observe": [{"quantity": "entropy", "at": 5}]}, "observe[0].at", "must be 'last-cell' or 'end', got 5"),
        ({"observe": [{"quantity": "entropy", "at": None}]}, "observe[0].at", "must be 'last-cell' or 'end'"),
        ({"observe": [{"quantity": "entropy", "at": {"log_spaced": 10**9}}]}, "observe[0].at.log_spaced", "1000"),
        (
            {
                "circuit__measurement_rate": {"from": 0, "to": 1, "points": 50_000},
                "circuit__replicate": {"from": 0, "to": 99, "points": 100},
            },
            "circuit",
            "the axes multiply to 15000000",
        ),
        (
            {"observe": [{"quantity": "entropi"}]},
            "observe[0]",
            "unknown quantity 'entropi': one of cluster-order, cross-entropy",
        ),
        (
            {"observe": [{"quantity": "entropy", "region": "third"}]},
            "observe[0].region",
            "must be 'half', 'every-cut' or 'every-interval'",
        ),
        ({"observe": [{"quantity": "entropy", "region": [3, 5, 3]}]}, "observe[0].region", "3 stands twice"),
        ({"observe": [{"quantity": "entropy", "region": [40]}]}, "observe[0].region", "outside a chain of 32 sites"),
        (
            {"observe": [{"quantity": "entropy", "at": [700]}]},
            "observe[0].at",
            "layer 700 is beyond the last layer",
        ),
        ({"observe": [{"quantity": "entropy", "at": {"every": 1}}]}, "observe[0].at", "single_layers = true"),
        (
            {"observe": [{"quantity": "entropy"}, {"quantity": "entropy"}]},
            "observe[1].name",
            "names another observation",
        ),
        ({"observe": [{"quantity": "entropy", "name": "9"}]}, "observe[0].name", "a letter first"),
        ({"stop__standard_error": [{"of": "j", "below": 0.1}]}, "stop.standard_error[0].of", "one of entropy, i3"),
        ({"stop__standard_error": [{"of": "i3", "below": 0}]}, "stop.standard_error[0].below", "greater than 0"),
        ({"stop__budget": -1}, "stop.budget", "greater than 0"),
        ({"priority": 11}, "priority", "less than or equal to 10"),
    ],
)
def test_a_bad_value_is_refused_with_its_path(change: dict[str, Any], path: str, words: str) -> None:
    found = faults(transition(**change))
    assert path in found
    assert words in found[path]


def test_quarters_and_antipodal_regions_need_sizes_they_divide() -> None:
    spec = small(
        circuit__sites=10,
        observe=[{"quantity": "tripartite-information"}, {"quantity": "mutual-information"}],
    )
    assert faults(spec) == {
        "observe[0].regions": "quarters need sites divisible by 4, got 10 (circuit.sites)",
        "observe[1].size": "the default size L/8 needs sites divisible by 8, got 10: give a size (circuit.sites)",
    }


def test_translations_of_an_open_chain_are_refused() -> None:
    spec = small(circuit__boundary="open", observe=[{"quantity": "entropy", "average_translations": True}])
    assert "only a periodic chain" in faults(spec)["observe[0].average_translations"]


def test_open_chains_may_have_an_odd_number_of_sites() -> None:
    spec = small(circuit__boundary=["open"], circuit__sites=[3, 5], observe=[{"quantity": "entropy"}])
    assert [point.ensemble.sites for point in Sweep.parse(spec).points] == [3, 3, 5, 5]


def test_blocks_form_a_union_in_which_shared_ensembles_count_once() -> None:
    first = {"family": "hybrid-clifford", "sites": 8, "measurement_rate": [0.1, 0.2]}
    second = {"family": "hybrid-clifford", "sites": [8, 16], "measurement_rate": [0.2, 0.3]}
    sweep = Sweep.parse(small(circuit=[first, second]))
    values = [(p.ensemble.sites, p.ensemble.parameters["measurement_rate"]) for p in sweep.points]
    assert values == [(8, 0.1), (8, 0.2), (8, 0.3), (16, 0.2), (16, 0.3)]


def test_a_block_may_carry_its_own_cap_but_not_contradict_another() -> None:
    first = {"family": "hybrid-clifford", "sites": 8, "measurement_rate": 0.1, "trajectories": 50}
    second = {"family": "hybrid-clifford", "sites": 16, "measurement_rate": 0.1}
    assert [point.cap for point in Sweep.parse(small(circuit=[first, second])).points] == [50, 300]
    assert "another cap" in faults(small(circuit=[first, {**first, "trajectories": 60}]))["circuit[1].trajectories"]


def test_two_spellings_of_one_number_of_layers_are_refused() -> None:
    assert "same number of layers" in faults(small(circuit__layers=[{"per_site": 2}, 16]))["circuit.layers"]


def test_limits_name_the_limit_and_what_was_asked() -> None:
    sweep = Sweep.parse(
        transition(
            observe=[{"quantity": "entropy", "region": "every-cut", "at": {"every": 2}}], stop__standard_error=[]
        )
    )
    limits = Limits(sites=100, layers=400, ensembles=20, trajectories=1000)
    assert check_limits(sweep, limits)[:4] == [
        Fault("circuit.sites", "this server takes at most 100 sites per ensemble, got 128"),
        Fault("circuit.layers", "this server takes at most 400 layers per ensemble, got 512"),
        Fault("circuit", "this server takes at most 20 ensembles per sweep, got 21"),
        Fault("stop.trajectories", "this server takes at most 1000 trajectories per ensemble, got 4000"),
    ]
    assert check_limits(sweep, limits)[4].path == "observe[0]"
    assert check_limits(Sweep.parse(transition()), Limits()) == []
