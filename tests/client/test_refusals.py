"""What a specification is refused for before any server sees it, and in which words."""

from pathlib import Path
from typing import Any

import pytest

from support.circuits import GATES, Z, faults, layered, specification
from sweepmill.errors import SpecificationError
from sweepmill.sweep import Sweep

STEP = "circuit.repeat[0][0]"
CHAIN: dict[str, Any] = {"family": "hybrid-clifford", "sites": 8, "measurement_rate": 0.1, "layers": 8}


def chain(**fields: Any) -> dict[str, Any]:
    return specification(**CHAIN | fields)


def observed(**observation: Any) -> dict[str, Any]:
    return {**chain(), "observe": [{"quantity": "entropy", **observation}]}


@pytest.mark.parametrize("per_site", [1e300, 1.7e308, 1_000_001])
def test_a_number_for_each_site_has_a_limit(per_site: float) -> None:
    wanted = "must be less than or equal to 1000000"
    drawn = {"apply": "uniform-clifford", "on": {"random_sequential": {"of": "bonds", "count": {"per_site": per_site}}}}
    paired = {"apply": "uniform-clifford", "on": {"random_pairs": {"count": {"per_site": per_site}}}}
    lattice = {"family": "hybrid-clifford-square", "width": 4, "height": 4, "measurement_rate": 0.1}
    assert wanted in faults(chain(layers={"per_site": per_site}))["circuit.layers.per_site"]
    assert wanted in faults(specification(**lattice, layers={"per_side": per_site}))["circuit.layers.per_side"]
    assert wanted in faults(layered([drawn]))[f"{STEP}.on.random_sequential.count.per_site"]
    assert wanted in faults(layered([paired]))[f"{STEP}.on.random_pairs.count.per_site"]


def nested(depth: int) -> dict[str, Any]:
    """A choice in a choice in a choice."""
    step: dict[str, Any] = {"depolarise": True}
    for _ in range(depth):
        step = {"choose": [{"weight": 1, "steps": [step]}]}
    return step | {"on": "sites"}


@pytest.mark.parametrize("depth", [60, 300, 1500, 5000])
def test_a_circuit_nested_too_deep_is_a_fault(depth: int) -> None:
    with pytest.raises(SpecificationError):
        Sweep.parse(layered([nested(depth)]))


def test_a_file_nested_too_deep_is_one_clear_fault(tmp_path: Path) -> None:
    (tmp_path / "deep.json").write_text("[" * 200_000 + "]" * 200_000)
    with pytest.raises(SpecificationError, match="nested too deep"):
        Sweep.read(tmp_path / "deep.json")


@pytest.mark.parametrize("value", ["no", "yes", "true", 0, 1, 1.0, None, []])
def test_what_is_true_or_false_is_not_spelled_otherwise(value: Any) -> None:
    message = f"must be true or false, got {value!r}"
    assert faults(layered([Z | {"recorded": value}])) == {f"{STEP}.recorded": message}
    assert faults(layered([Z | {"forced": value}])) == {f"{STEP}.forced": message}
    assert faults(layered([GATES | {"rotated": value}])) == {f"{STEP}.rotated": message}
    complement = {"parameter": "p", "complement": value}
    assert faults(layered([Z | {"rate": complement}], parameters={"p": 0.1})) == {f"{STEP}.rate.complement": message}
    assert faults(observed(histogram=value)) == {"observe[0].histogram": message}
    assert faults(observed(average_translations=value)) == {"observe[0].average_translations": message}
    assert faults(observed(quantity="outcome-randomness", cumulative=value)) == {"observe[0].cumulative": message}


def test_a_flat_list_of_steps_is_told_from_a_list_of_layers() -> None:
    flat = layered()
    flat["circuit"]["repeat"] = [GATES, Z]
    message = "a layer is a list of steps: write repeat = [[ … ]]"
    assert faults(flat) == {"circuit.repeat[0]": message, "circuit.repeat[1]": message}


def test_two_forms_of_places_at_once_are_named() -> None:
    places = {"random_sequential": {"count": 3, "of": "sites"}, "blocks": {"width": 1}}
    found = faults(layered([{"depolarise": True, "on": places}]))
    assert found == {f"{STEP}.on": "exactly one form is allowed, got random_sequential and blocks"}
