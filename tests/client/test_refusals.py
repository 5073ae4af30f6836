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
    every = {"every": 2, "single_layers": value}
    assert faults(observed(at=every)) == {"observe[0].at.single_layers": message}
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


ISING: dict[str, Any] = {"family": "projective-ising", "sites": 8, "layers": 8}
SIDEWAYS: dict[str, Any] = {"family": "rotated-clifford", "sites": 8, "layers": 8}
RANDOM: dict[str, Any] = {"apply": "uniform-clifford", "on": "sites"}
FORCED: dict[str, Any] = Z | {"forced": True}
BEGINNING, AFTER = "circuit.initial_state", "circuit.after"
LATTICE: dict[str, Any] = {"family": "hybrid-clifford-square", "width": 4, "height": 4, "measurement_rate": 0.1}


def written(**fields: Any) -> dict[str, Any]:
    """A circuit block written as data whose last layer can be read."""
    block: dict[str, Any] = layered([GATES, Z], [GATES, Z], **fields)["circuit"]
    return block


@pytest.mark.parametrize("rate", [0.9999999, 1 - 1e-12, 1e-7])
def test_a_bond_rate_and_its_complement_are_resolved_alike(rate: float) -> None:
    assert "0 or at least 1e-06" in faults(specification(**ISING, bond_rate=rate))["circuit.bond_rate"]


@pytest.mark.parametrize("rate", [0, 1e-6, 0.5, 0.999999, 1])
def test_bond_rates_that_are_resolved_pass(rate: float) -> None:
    assert faults(specification(**ISING, bond_rate=rate)) == {}


def test_the_complement_of_a_parameter_is_resolved_no_finer() -> None:
    rest = {"parameter": "p", "complement": True}
    assert "0 or at least 1e-06" in faults(layered([Z | {"rate": rest}], parameters={"p": 0.9999999}))[f"{STEP}.rate"]


@pytest.mark.parametrize(
    ("spec", "path", "message"),
    [
        (layered([{"choose": [3], "on": "sites"}]), f"{STEP}.choose[0]", "must be a table of fields, got 3"),
        (
            layered([{"depolarise": True, "on": {"sublattice": 3}}]),
            f"{STEP}.on.sublattice",
            "must be a table of fields, got 3",
        ),
        (layered([Z], parameters=3), "circuit.parameters", "must be a table of fields, got 3"),
        (layered([Z], parameters={5: 1}), "circuit.parameters[5]", "must be text, got 5"),
        (layered([Z | {9: 5}]), f"{STEP}[9]", "the name of a field must be text, got 9"),  # type: ignore[list-item]
        (layered([Z | {"rate": {"parameter": 5}}]), f"{STEP}.rate.parameter", "must be text, got 5"),
        (
            layered([Z | {"rate": {"disorder": "two-valued", "values": [1], "weight": 0.5}}]),
            f"{STEP}.rate.values",
            "needs at least 2 items, got [1]",
        ),
        (observed(at={"average_over": 3}), "observe[0].at.average_over", "must be a table of fields, got 3"),
        (observed() | {"observe": [5]}, "observe[0]", "must be a table of fields, got 5"),
        (
            observed(name="9"),
            "observe[0].name",
            "must be up to 64 letters, digits and the signs _ . and -, a letter first, got '9'",
        ),
        (
            observed(quantity="pauli-expectation", pauli="A", sites=[1]),
            "observe[0].pauli",
            "must be a product of the letters X, Y and Z, got 'A'",
        ),
        (
            observed(quantity="cross-entropy", against="mixed"),
            "observe[0].against",
            "must be 'zeros' or 'plus', got 'mixed'",
        ),
        (observed(quantity="cross-entropy"), "observe[0].against", "is missing"),
        (
            observed(quantity="mutual-information", regions=[[1], [2], [3]]),
            "observe[0].regions",
            "takes at most 2 items, got ([1], [2], [3])",
        ),
        (chain() | {"stop": 5}, "stop", "must be a table of fields, got 5"),
        (chain() | {"label": 5}, "label", "must be text, got 5"),
        (chain() | {"label": b"\xff"}, "label", "must be text, got b'\\xff'"),
        (chain() | {"label": "a\nb"}, "label", "must be of printable characters, got 'a\\nb'"),
        (chain() | {"label": "\x1b[2J"}, "label", "must be of printable characters, got '\\x1b[2J'"),
    ],
)
def test_faults_are_in_words_of_a_specification(spec: dict[str, Any], path: str, message: str) -> None:
    assert faults(spec) == {path: message}


@pytest.mark.parametrize(
    ("circuit", "observation", "place"),
    [
        (CHAIN | {"boundary": "open"}, {"quantity": "entropy", "average_translations": True}, "circuit.boundary"),
        (LATTICE, {"quantity": "generator-lengths"}, "circuit.family"),
        (LATTICE, {"quantity": "reference-entropy"}, "circuit.family"),
        (CHAIN, {"quantity": "reference-entropy"}, "circuit.references"),
        (CHAIN | {"engine": ["auto"]}, {"quantity": "pauli-expectation", "pauli": "Z", "sites": [0]}, "circuit.engine"),
        (CHAIN | {"engine": ["auto", "reference"]}, {"quantity": "cluster-order"}, "circuit.family"),
        (ISING | {"bond_rate": 0.5, "engine": "reference"}, {"quantity": "cluster-order"}, "circuit.engine"),
        (CHAIN, {"quantity": "cross-entropy", "against": "zeros"}, "circuit.initial_state"),
        (ISING | {"bond_rate": 0.5}, {"quantity": "cross-entropy", "against": "plus"}, "circuit.family"),
        (ISING | {"bond_rate": 0.5}, {"quantity": "cross-entropy", "against": "zeros"}, "circuit.engine"),
        (SIDEWAYS, {"quantity": "cross-entropy", "against": "plus"}, "circuit.family"),
        (written(after=[[RANDOM, FORCED]]), {"quantity": "cross-entropy", "against": "plus", "at": "end"}, AFTER),
        (written(before=[[Z]]), {"quantity": "cross-entropy", "against": "plus"}, "circuit.engine"),
        (written(initial_state=["zeros", "plus"]), {"quantity": "cross-entropy", "against": "plus"}, BEGINNING),
        (CHAIN, {"quantity": "entropy", "at": [9]}, "circuit.layers"),
        (CHAIN | {"sites": [16, 10]}, {"quantity": "tripartite-information"}, "circuit.sites[1]"),
        (LATTICE, {"quantity": "entropy", "region": [16]}, "circuit.width"),
        (CHAIN, {"quantity": "mutual-information", "regions": [[1], [1]]}, None),
    ],
)
def test_a_misfit_names_the_field_of_the_circuit_once(
    circuit: dict[str, Any], observation: dict[str, Any], place: str | None
) -> None:
    with pytest.raises(SpecificationError) as refused:
        Sweep.parse(specification(**circuit) | {"observe": [observation]})
    (fault,) = refused.value.faults
    assert fault.message.endswith(f" ({place})") if place else "(" not in fault.message


P: dict[str, Any] = {"parameter": "p"}
REST: dict[str, Any] = {"parameter": "p", "complement": True}


@pytest.mark.parametrize(
    ("step", "value", "path", "end"),
    [
        (Z | {"rate": P}, 1.5, f"{STEP}.rate", "between 0 and 1, got 1.5 (p = 1.5)"),
        (Z | {"rate": REST}, 1.5, f"{STEP}.rate", "between 0 and 1, got -0.5 (1 - p, p = 1.5)"),
        (
            Z | {"rate": {"disorder": "uniform", "from": 0, "to": P}},
            1.5,
            f"{STEP}.rate.to",
            "between 0 and 1, got 1.5 (p = 1.5)",
        ),
        (
            {"choose": [{"weight": P, "steps": []}, {"weight": 1, "steps": []}], "on": "sites"},
            -1,
            f"{STEP}.choose[0].weight",
            "at least 0, got -1 (p = -1)",
        ),
        (
            {"apply": "uniform-clifford", "on": {"random_pairs": {"exponent": P}}},
            -1,
            f"{STEP}.on.random_pairs.exponent",
            "got -1 (p = -1)",
        ),
    ],
)
def test_a_value_out_of_range_is_traced_to_its_parameter(
    step: dict[str, Any], value: float, path: str, end: str
) -> None:
    found = faults(layered([step], parameters={"p": [0.5, value]}))
    assert list(found) == [path]
    assert found[path].endswith(end)


@pytest.mark.parametrize("name", ["a\nb", "\x1b[2J", "\x00"])
def test_the_name_of_a_circuit_is_printable(name: str) -> None:
    wanted = f"must be of printable characters, got {name!r}"
    assert faults(layered([Z], name=name)) == {"circuit.name": wanted}
